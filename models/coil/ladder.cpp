// SPDX-License-Identifier: MIT
#include "models/coil/ladder.h"

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <stdexcept>
#include <string>

#include "models/coil/filament.h"

namespace couplet::coil {
namespace {

using Vector = Eigen::VectorXd;
using Matrix = Eigen::MatrixXd;

/// Logarithms of: series resistance, series inductance, then resistance and corner (rad/s) of each branch.
struct Problem {
  const std::vector<Sample>& samples;

  int rows() const { return 2 * static_cast<int>(samples.size()); }

  /// Relative deviations of R (first half) and of L (second half), and their slopes.
  void evaluate(const Vector& p, Vector& deviation, Matrix* slope) const {
    const int n = static_cast<int>(samples.size()), branches = (static_cast<int>(p.size()) - 2) / 2;
    deviation.resize(2 * n);
    if (slope) slope->setZero(2 * n, p.size());
    for (int i = 0; i < n; ++i) {
      const Sample& s = samples[i];
      const double omega = 2 * pi * s.frequency;
      double r = std::exp(p[0]), l = std::exp(p[1]);
      const double per_r = 1 / s.resistance, per_l = s.frequency > 0 ? 1 / s.inductance : 0;
      if (slope) (*slope)(i, 0) = r * per_r, (*slope)(n + i, 1) = l * per_l;
      for (int k = 0; k < branches; ++k) {
        const double rk = std::exp(p[2 + 2 * k]), corner = std::exp(p[3 + 2 * k]);
        const double u = omega / corner, share = 1 / (1 + u * u);
        const double part_r = rk * u * u * share, part_l = rk / corner * share;
        r += part_r, l += part_l;
        if (!slope) continue;
        (*slope)(i, 2 + 2 * k) = part_r * per_r;
        (*slope)(n + i, 2 + 2 * k) = part_l * per_l;
        (*slope)(i, 3 + 2 * k) = -2 * part_r * share * per_r;
        (*slope)(n + i, 3 + 2 * k) = part_l * (2 * u * u * share - 1) * per_l;
      }
      deviation[i] = r * per_r - 1;
      deviation[n + i] = per_l > 0 ? l * per_l - 1 : 0;
    }
  }
};

/// Marquardt's damping, on logarithms held within 60 e-folds so that nothing overflows.
Vector refine(const Problem& problem, Vector p) {
  Vector deviation, trial_deviation;
  Matrix slope;
  problem.evaluate(p, deviation, &slope);
  double damping = 1e-2;
  for (int step = 0; step < 200; ++step) {
    const Matrix square = slope.transpose() * slope;
    const Vector down = slope.transpose() * deviation;
    Matrix damped = square;
    damped.diagonal() += damping * (square.diagonal().array() + 1e-12).matrix();
    Vector move = -damped.ldlt().solve(down);
    const double longest = move.cwiseAbs().maxCoeff();
    if (!std::isfinite(longest)) break;
    if (longest > 2) move *= 2 / longest;
    const Vector trial = (p + move).cwiseMax(-60).cwiseMin(60);
    problem.evaluate(trial, trial_deviation, nullptr);
    const double before = deviation.squaredNorm(), after = trial_deviation.squaredNorm();
    if (after < before) {
      p = trial;
      problem.evaluate(p, deviation, &slope);
      damping = std::max(damping / 5, 1e-12);
      if (before - after < 1e-9 * before || after < 1e-28) break;
    } else {
      damping *= 4;
      if (damping > 1e12) break;
    }
  }
  return p;
}

Ladder ladder_of(const Vector& p, const std::vector<Sample>& samples) {
  Ladder made;
  made.resistance = std::exp(p[0]), made.inductance = std::exp(p[1]);
  for (int k = 0; 2 + 2 * k < p.size(); ++k) {
    const double r = std::exp(p[2 + 2 * k]), corner = std::exp(p[3 + 2 * k]);
    made.branches.push_back({r, r / corner});
  }
  std::sort(made.branches.begin(), made.branches.end(), [](const Branch& a, const Branch& b) {
    return a.resistance / a.inductance < b.resistance / b.inductance;
  });
  made.low = 1e300;
  for (const Sample& s : samples) {
    if (s.frequency > 0)
      made.low = std::min(made.low, s.frequency), made.high = std::max(made.high, s.frequency);
    const Sample here = made.at(s.frequency);
    const double r = std::abs(here.resistance / s.resistance - 1);
    const double l = s.frequency > 0 ? std::abs(here.inductance / s.inductance - 1) : 0;
    if (r > made.resistance_deviation)
      made.resistance_deviation = r, made.resistance_deviation_at = s.frequency;
    if (l > made.inductance_deviation)
      made.inductance_deviation = l, made.inductance_deviation_at = s.frequency;
  }
  return made;
}

double worst(const Ladder& l) { return std::max(l.resistance_deviation, l.inductance_deviation); }

void check(const std::vector<Sample>& samples) {
  int frequencies = 0;
  for (const Sample& s : samples) {
    const bool good = s.frequency >= 0 && s.resistance > 0 && (s.frequency == 0 || s.inductance > 0) &&
                      std::isfinite(s.frequency + s.resistance + s.inductance);
    if (!good)
      throw std::invalid_argument("a ladder needs positive resistances and inductances; not so at " +
                                  std::to_string(s.frequency) + " Hz");
    frequencies += s.frequency > 0;
  }
  if (frequencies < 2) throw std::invalid_argument("a ladder needs values at two frequencies or more");
}

}  // namespace

Sample Ladder::at(double frequency) const {
  const double omega = 2 * pi * frequency;
  Sample sum{frequency, resistance, inductance};
  for (const Branch& b : branches) {
    const double u = omega * b.inductance / b.resistance, share = 1 / (1 + u * u);
    sum.resistance += b.resistance * u * u * share;
    sum.inductance += b.inductance * share;
  }
  return sum;
}

Ladder fit_ladder(const std::vector<Sample>& samples, double goal, int most_branches) {
  check(samples);
  // Work at a scale of one: ohms over the smallest resistance, hertz over the middle of the band.
  double low = 1e300, high = 0, ohms = 1e300;
  for (const Sample& s : samples) {
    ohms = std::min(ohms, s.resistance);
    if (s.frequency > 0) low = std::min(low, s.frequency), high = std::max(high, s.frequency);
  }
  const double hertz = std::sqrt(low * high);
  std::vector<Sample> scaled;
  double henries = 0;
  for (const Sample& s : samples) {
    scaled.push_back({s.frequency / hertz, s.resistance / ohms, s.inductance * hertz / ohms});
    if (s.frequency == high) henries = scaled.back().inductance;
  }
  const Problem problem{scaled};
  Vector best(2);
  best << 0, std::log(henries);
  best = refine(problem, best);
  for (int branches = 0; branches < most_branches && worst(ladder_of(best, scaled)) > goal; ++branches) {
    // One more branch, tried at corners from below the band to well above it; a small one, which only helps.
    Vector next;
    double least = 1e300, least_worst = 1e300;
    for (const double corner : band(0.3 * low / hertz, 30 * high / hertz, 9)) {
      Vector trial(best.size() + 2);
      trial << best, std::log(0.1), std::log(2 * pi * corner);
      trial = refine(problem, trial);
      Vector deviation;
      problem.evaluate(trial, deviation, nullptr);
      if (deviation.squaredNorm() < least) {
        least = deviation.squaredNorm(), next = trial;
        least_worst = worst(ladder_of(next, scaled));
      }
    }
    if (least_worst > 0.999 * worst(ladder_of(best, scaled)))
      break;  // the data are not those of a passive ladder
    best = next;
  }
  best[0] += std::log(ohms), best[1] += std::log(ohms / hertz);
  for (int k = 2; k < best.size(); k += 2) best[k] += std::log(ohms), best[k + 1] += std::log(hertz);
  return ladder_of(best, samples);
}

std::vector<double> band(double low, double high, int count) {
  std::vector<double> list;
  for (int i = 0; i < count; ++i)
    list.push_back(low * std::pow(high / low, i / double(std::max(count - 1, 1))));
  return list;
}

}  // namespace couplet::coil
