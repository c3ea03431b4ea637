// SPDX-License-Identifier: MIT
// What the circuit is told from outside, over time: waveforms as extra states, and switch commands.
#include <cmath>
#include <limits>

#include "engine/circuit/circuit.h"

namespace couplet {
namespace {

constexpr double never = std::numeric_limits<double>::infinity();

/// Value and slope of a broken line just after t.
std::pair<double, double> broken_line(const Waveform& wave, double t) {
  double shift = 0;
  if (wave.period > 0) {
    // Whole periods, corrected so that a corner computed as shift + point.time is seen as reached.
    double n = std::floor((t - wave.points.front().time) / wave.period);
    if (t >= wave.points.front().time + (n + 1) * wave.period) n += 1;
    shift = n * wave.period;
  }
  const auto& p = wave.points;
  if (t < p.front().time + shift) return {p.front().value, 0};
  for (std::size_t i = p.size(); i-- > 0;) {
    if (t < p[i].time + shift) continue;
    if (i + 1 == p.size()) return {p[i].value, 0};
    const double slope = (p[i + 1].value - p[i].value) / (p[i + 1].time - p[i].time);
    return {p[i].value + slope * (t - (p[i].time + shift)), slope};
  }
  return {p.front().value, 0};
}

double next_point(const Waveform& wave, double t) {
  double best = never;
  if (wave.period <= 0) {
    for (const auto& p : wave.points) {
      if (p.time > t) best = std::min(best, p.time);
    }
    return best;
  }
  const double n = std::floor((t - wave.points.front().time) / wave.period);
  for (double round : {n - 1, n, n + 1}) {
    for (const auto& p : wave.points) {
      if (const double when = p.time + round * wave.period; when > t) best = std::min(best, when);
    }
  }
  return best;
}

}  // namespace

Eigen::VectorXd Circuit::inputs_at(double t) const {
  Eigen::VectorXd u = Eigen::VectorXd::Zero(inputs_);
  u[0] = 1;
  for (int w = 0; w < static_cast<int>(sheet_.waveforms.size()); ++w) {
    const Waveform& wave = sheet_.waveforms[w];
    const int i = input_of_waveform(w);
    if (wave.points.empty()) {
      const double angle = 2 * M_PI * (wave.frequency * t - std::floor(wave.frequency * t)) + wave.phase;
      u[i] = wave.amplitude * std::sin(angle);
      u[i + 1] = wave.amplitude * std::cos(angle);
    } else {
      std::tie(u[i], u[i + 1]) = broken_line(wave, t);
    }
  }
  return u;
}

double Circuit::next_corner(double t) const {
  double best = never;
  for (const auto& wave : sheet_.waveforms) {
    if (!wave.points.empty()) best = std::min(best, next_point(wave, t));
  }
  return best;
}

bool Circuit::command_bit(int command, double t) const {
  const Command& c = sheet_.commands[command];
  const double period = 1 / c.frequency;
  const double n = std::floor(t / period - c.phase);
  for (double round : {n + 1, n, n - 1}) {
    const double on = (round + c.phase) * period + c.dead, off = (round + c.phase + c.duty) * period;
    if (t >= on && t < off) return true;
  }
  return false;
}

double Circuit::next_toggle(int command, double t) const {
  const Command& c = sheet_.commands[command];
  const double period = 1 / c.frequency;
  const double n = std::floor(t / period - c.phase);
  double best = never;
  for (double round : {n - 1, n, n + 1, n + 2}) {
    const double on = (round + c.phase) * period + c.dead, off = (round + c.phase + c.duty) * period;
    if (off <= on) continue;
    if (on > t) best = std::min(best, on);
    if (off > t) best = std::min(best, off);
  }
  return best;
}

}  // namespace couplet
