// SPDX-License-Identifier: MIT
// Which cells hold at an instant. The states are given; the cells of all branches must hold together, which is a linear
// complementarity problem. Flip what is violated; where that goes round in circles, flip one condition at a time, the
// first in order (K. G. Murty, Opsearch 11 (1974) 123: the least-index rule ends for the matrices of passive laws).
#include <fmt/format.h>

#include <set>

#include "engine/march/exact.h"

namespace couplet {
namespace {
constexpr double roundoff = 1.0 / (1ULL << 44);
constexpr double slope_roundoff = 1.0 / (1ULL << 38);
constexpr int rounds_together = 8;
}  // namespace

/// Bits of a branch that its cell does not watch are read from the state as it is now.
void ExactMarch::refresh_bits(int b) {
  const Branch& branch = circuit_.sheet().branches[b];
  const std::uint32_t mask = branch.cells[state_->cells[b]].mask;
  for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
    const Condition& condition = branch.conditions[c];
    if ((mask >> c & 1U) || condition.command >= 0) continue;
    const bool bit = circuit_.evaluate(condition.form, outputs_, Eigen::Map<const Eigen::VectorXd>(x_.data() + circuit_.states(), circuit_.inputs())) > 0;
    state_->bits[b] = (state_->bits[b] & ~(1U << c)) | (static_cast<std::uint32_t>(bit) << c);
  }
}

bool ExactMarch::decide(std::string& trouble) {
  const auto& branches = circuit_.sheet().branches;
  // Branches that switched: bring their unwatched bits up to date with the outputs before the switch.
  const auto rematch = [&](const Topology& before) {
    bool any = false;
    for (std::size_t b = 0; b < branches.size(); ++b) {
      if (!changed_[b]) continue;
      if (!any) outputs_.noalias() = before.C * Eigen::Map<const Eigen::VectorXd>(x_.data(), n_);
      any = true;
      refresh_bits(static_cast<int>(b));
      state_->cells[b] = static_cast<std::uint8_t>(Circuit::match_cell(branches[b], state_->bits[b]));
      changed_[b] = 0;
    }
  };
  std::vector<int> flipped;
  int rounds_allowed = 50;
  for (const auto& b : branches) rounds_allowed += 8 * static_cast<int>(b.conditions.size());
  try {
    for (int round = 0; round < rounds_allowed; ++round) {
      rematch(flow_->topology());
      enter(circuit_.topology(state_->cells));
      const auto& watches = flow_->topology().watches;
      const int block = flow_->watch_stride();
      bool any = false;
      for (int i = 0; i < flow_->watches(); ++i) {
        const double v = signs_[i] * guards0_[i], d = signs_[i] * guards0_[block + i];
        if (v > 0) continue;
        const double tolerance = roundoff * flow_->watch_scale(i, x_.data());
        const bool leaves = v >= -tolerance && d < -slope_roundoff * flow_->slope_scale(i, x_.data());
        if (v >= -tolerance && !leaves) continue;
        if (watches[i].branch < 0) {
          // A probe has no law: its bit simply follows (its crossing was a jump from outside).
          state_->probe_bits[watches[i].condition] ^= 1;
          signs_[i] = -signs_[i];
          continue;
        }
        state_->bits[watches[i].branch] ^= 1U << watches[i].condition;
        changed_[watches[i].branch] = 1;
        any = true;
        flipped.push_back(watches[i].branch);
        if (round >= rounds_together) break;
      }
      if (!any) return true;
    }
  } catch (const CircuitError& error) {
    trouble = fmt::format("at {:.9g} s: {}", state_->time, error.what());
    return false;
  }
  std::set<std::string> names;
  for (std::size_t k = flipped.size() > 40 ? flipped.size() - 40 : 0; k < flipped.size(); ++k) names.insert(branches[flipped[k]].name);
  std::string list;
  for (const auto& name : names) list += (list.empty() ? "" : ", ") + name;
  trouble = fmt::format("at {:.9g} s no set of regions of {} holds together; a small capacitor or resistor at their common node decides it",
                        state_->time, list);
  return false;
}

/// Takes the event's bit, and those of all conditions that reach zero at the same instant, to the other side.
void ExactMarch::flip_event(Observer* observer, int watch) {
  const auto& watches = flow_->topology().watches;
  const int block = flow_->watch_stride();
  ++standing_events_;
  for (int i = 0; i < flow_->watches(); ++i) {
    if (i != watch) {
      if (std::abs(guards0_[i]) > roundoff * flow_->watch_scale(i, x_.data())) continue;
      if (signs_[i] * guards0_[block + i] >= -slope_roundoff * flow_->slope_scale(i, x_.data())) continue;
    }
    const Watch& w = watches[i];
    ++report_.events;
    Event event{w.branch < 0 ? Event::Kind::probe : Event::Kind::region, state_->time, w.branch, w.condition, signs_[i] < 0, &flow_->topology(), x_.data()};
    if (w.branch < 0) {
      state_->probe_bits[w.condition] = signs_[i] < 0;
    } else {
      state_->bits[w.branch] ^= 1U << w.condition;
      changed_[w.branch] = 1;
      if (static_cast<int>(recent_.size()) < 1000) recent_.push_back(w.branch);
    }
    if (observer) observer->event(event);
  }
}

/// Corners and commands due now. True where nothing was due (the cells stand).
bool ExactMarch::apply_outside(Observer* observer) {
  bool nothing = true;
  const double t = state_->time;
  bool corner = false;
  for (const auto& wave : circuit_.sheet().waveforms) corner = corner || !wave.points.empty();
  if (corner) {
    const Eigen::VectorXd u = circuit_.inputs_at(t);
    for (std::size_t w = 0; w < circuit_.sheet().waveforms.size(); ++w) {
      if (circuit_.sheet().waveforms[w].points.empty()) continue;
      const int i = circuit_.input_of_waveform(static_cast<int>(w));
      double* at = x_.data() + circuit_.states() + i;
      if (at[0] == u[i] && at[1] == u[i + 1]) continue;
      if (at[1] != u[i + 1]) ++report_.corners;
      at[0] = u[i];
      at[1] = u[i + 1];
      nothing = false;
    }
  }
  for (std::size_t b = 0; b < circuit_.sheet().branches.size(); ++b) {
    const Branch& branch = circuit_.sheet().branches[b];
    for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
      if (branch.conditions[c].command < 0) continue;
      const bool bit = circuit_.command_bit(branch.conditions[c].command, t);
      if (bit == ((state_->bits[b] >> c & 1U) != 0)) continue;
      state_->bits[b] ^= 1U << c;
      changed_[b] = 1;
      nothing = false;
      ++report_.commands;
      if (observer) {
        observer->event({Event::Kind::command, t, static_cast<int>(b), static_cast<int>(c), bit, &flow_->topology(), x_.data()});
      }
    }
  }
  return nothing;
}

std::string ExactMarch::pile_up_sentence() const {
  std::set<std::string> names;
  for (int b : recent_) names.insert(circuit_.sheet().branches[b].name);
  std::string list;
  for (const auto& name : names) list += (list.empty() ? "" : ", ") + name;
  return fmt::format("at {:.9g} s the regions of {} change back and forth without time passing; give the switching node a "
                     "capacitance, or the switch a finite gain or some hysteresis",
                     state_->time, list);
}

bool ExactMarch::resume(MarchState& state, std::string& trouble) { return resume_flipped(state, {}, trouble); }

bool ExactMarch::resume_flipped(MarchState& state, const std::vector<char>& flipped, std::string& trouble) {
  state_ = &state;
  std::copy_n(state.x.data(), n_, x_.begin());
  std::fill(x_.begin() + n_, x_.end(), 0.0);
  enter(circuit_.topology(state.cells));
  std::copy(flipped.begin(), flipped.end(), changed_.begin());
  const bool good = decide(trouble);
  state_ = nullptr;
  return good;
}

MarchState ExactMarch::stand(const Eigen::VectorXd& xi, double time) {
  MarchState state;
  state.time = time;
  state.x.resize(n_);
  state.x << xi, circuit_.inputs_at(time);
  const auto& branches = circuit_.sheet().branches;
  state.bits.assign(branches.size(), 0);
  state.cells.assign(branches.size(), 0);
  for (std::size_t b = 0; b < branches.size(); ++b) {
    for (std::size_t c = 0; c < branches[b].conditions.size(); ++c) {
      const Condition& condition = branches[b].conditions[c];
      const bool bit = condition.command >= 0 ? circuit_.command_bit(condition.command, time) : condition.start;
      state.bits[b] |= static_cast<std::uint32_t>(bit) << c;
    }
    state.cells[b] = static_cast<std::uint8_t>(Circuit::match_cell(branches[b], state.bits[b]));
  }
  state.probe_bits.assign(circuit_.sheet().probes.size(), 0);
  state_ = &state;
  std::copy_n(state.x.data(), n_, x_.begin());
  std::fill(x_.begin() + n_, x_.end(), 0.0);
  hint_ = std::numeric_limits<double>::infinity();
  enter(circuit_.topology(state.cells));
  std::string trouble;
  if (!decide(trouble)) throw CircuitError(trouble);
  state_ = nullptr;
  return state;
}

}  // namespace couplet
