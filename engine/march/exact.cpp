// SPDX-License-Identifier: MIT
#include "engine/march/exact.h"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <set>

namespace couplet {
namespace {

// Round-off of a form's value, as a share of the sum of its terms' sizes. States carry a few hundred roundings of
// rung products, so 2^-44 (256 units in the last place) rather than one.
constexpr double roundoff = 1.0 / (1ULL << 44);
// Round-off of a form's slope: slopes are products with rates that cancel more, hence looser.
constexpr double slope_roundoff = 1.0 / (1ULL << 38);
constexpr int most_standing_events = 1000;
constexpr double growth = 2;  // of the step after one that was clear

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

}  // namespace

std::unique_ptr<March> exact_march(const Circuit& circuit, const MarchSettings& settings) {
  return std::make_unique<ExactMarch>(circuit, settings);
}

ExactMarch::ExactMarch(const Circuit& circuit, const MarchSettings& settings)
    : circuit_(circuit), settings_(settings), n_(circuit.size()), stride_(padded(circuit.size())) {
  x_.assign(stride_, 0);
  next_ = x_;
  show_ = x_;
  scratch_ = x_;
  terms_.assign(static_cast<std::size_t>(stride_) * (Flow::order + 1), 0);
  tail_terms_ = terms_;
  path_.assign(Flow::top + 2, x_);
  path_rungs_.assign(Flow::top + 2, 0);
  changed_.assign(circuit.sheet().branches.size(), 0);
  recent_.reserve(most_standing_events + 1);
}

const Flow& ExactMarch::flow(const Topology& topology) {
  if (static_cast<int>(flows_.size()) <= topology.id) flows_.resize(topology.id + 1);
  auto& slot = flows_[topology.id];
  if (!slot) {
    slot = std::make_unique<Flow>(circuit_, topology, settings_.fineness);
    const std::size_t need = 3 * static_cast<std::size_t>(slot->watch_stride());
    if (guards0_.size() < need) guards0_.resize(need), guards1_.resize(need);
    if (signs_.size() < static_cast<std::size_t>(slot->watch_stride())) signs_.resize(slot->watch_stride());
  }
  return *slot;
}

void ExactMarch::enter(const Topology& topology) {
  flow_ = &flow(topology);
  for (int i = 0; i < flow_->watches(); ++i) {
    const Watch& w = topology.watches[i];
    signs_[i] = (w.branch < 0 ? state_->probe_bits[w.condition] != 0 : w.bit) ? 1 : -1;
  }
  flow_->guards(x_.data(), guards0_.data());
}

void ExactMarch::advance(const Flow& flow, const double* x0, double tau, double* x) {
  std::copy(x0, x0 + stride_, x);
  double left = tau;
  for (int k = flow.rung_below(left); k >= 0; k = flow.rung_below(left)) {
    flow.step(k, x, scratch_.data());
    std::copy(scratch_.begin(), scratch_.end(), x);
    left -= flow.rung_length(k);
  }
  if (left <= 0) return;
  flow.series(x, terms_.data());
  for (int i = 0; i < stride_; ++i) x[i] = terms_[static_cast<long>(Flow::order) * stride_ + i];
  for (int j = Flow::order - 1; j >= 0; --j) {
    const double* term = terms_.data() + static_cast<long>(j) * stride_;
    for (int i = 0; i < stride_; ++i) x[i] = term[i] + left * x[i];
  }
}

void ExactMarch::at(double tau, double* x) const {
  // const for observers; the work buffers are this march's own.
  auto& self = const_cast<ExactMarch&>(*this);
  self.advance(*flow_, shown_from_, tau, show_.data());
  std::copy(show_.begin(), show_.begin() + n_, x);
}

/// Fills next_ and guards1_ with the state h later; on a rung where rung >= 0, else bit by bit and a series.
bool ExactMarch::attempt(double h, int rung) {
  path_length_ = 0;
  tail_ = 0;
  const double* from = x_.data();
  if (rung >= 0) {
    path_rungs_[path_length_++] = rung;
    flow_->step(rung, from, next_.data());
  } else {
    double left = h;
    for (int k = flow_->rung_below(left); k >= 0; k = flow_->rung_below(left)) {
      // The last slot repeats the top rung where h is longer than the ladder.
      path_rungs_[path_length_] = k;
      flow_->step(k, from, path_[path_length_].data());
      from = path_[path_length_++].data();
      left -= flow_->rung_length(k);
    }
    if (left > 0) {
      tail_ = left;
      flow_->series(from, tail_terms_.data());
      std::copy_n(tail_terms_.data() + static_cast<long>(Flow::order) * stride_, stride_, next_.data());
      for (int j = Flow::order - 1; j >= 0; --j) {
        const double* term = tail_terms_.data() + static_cast<long>(j) * stride_;
        for (int i = 0; i < stride_; ++i) next_[i] = term[i] + left * next_[i];
      }
    } else {
      std::copy_n(from, stride_, next_.data());
    }
  }
  flow_->guards(next_.data(), guards1_.data());
  return true;
}

ExactMarch::Finding ExactMarch::check(double h, const double* v0, const double* v1, const double* x0, const double* x1,
                                      int exempt, bool finest) {
  const int m = flow_->watches(), block = flow_->watch_stride();
  Finding worst;
  for (int i = 0; i < m; ++i) {
    const double s = signs_[i], sh = s * h, shh = sh * h;
    const GuardStep g{s * v0[i], sh * v0[block + i], shh * v0[2 * block + i],
                      s * v1[i], sh * v1[block + i], shh * v1[2 * block + i]};
    // An unstable topology overflows over too long a step: not a number is not clear.
    if (!std::isfinite(g.doubt())) return {Outcome::unresolved, i, 0, 16};
    if (g.margin() > 0 && i != exempt) continue;
    const Finding f = examine(g, h, i, x0, x1, exempt < 0 ? End::open : i == exempt ? End::own_event : End::other_event, finest);
    if (f.outcome == Outcome::clear) continue;
    if (f.outcome == Outcome::unresolved) {
      if (worst.outcome != Outcome::unresolved || f.shrink > worst.shrink) worst = f;
    } else if (worst.outcome == Outcome::clear || (worst.outcome == Outcome::crossing && f.root < worst.root)) {
      worst = f;
    }
  }
  return worst;
}

ExactMarch::Finding ExactMarch::examine(const GuardStep& g, double h, int watch, const double* x0, const double* x1,
                                        End end, bool finest) const {
  const double tolerance0 = roundoff * flow_->watch_scale(watch, x0), tolerance1 = roundoff * flow_->watch_scale(watch, x1);
  const double doubt = g.doubt();
  // A guard that lies within round-off all the way (two halves that are exactly alike) never moves away: no event.
  if (std::abs(g.v0) <= tolerance0 && std::abs(g.v1) <= tolerance1 && std::abs(g.d0) <= h * slope_roundoff * flow_->slope_scale(watch, x0) &&
      std::abs(g.d1) <= h * slope_roundoff * flow_->slope_scale(watch, x1)) {
    return {};
  }
  const bool rests = std::abs(g.v0) <= tolerance0;
  if (end == End::own_event) {
    // The watch whose event ends this step: it must only not have crossed on the way.
    double where = 0;
    if (finest || rests || g.lowest(where) >= -std::max(tolerance0, tolerance1) - doubt / 16) return {};
  }
  const double size = std::max({std::abs(g.v0), std::abs(g.v1), std::abs(g.d0) / 8, std::abs(g.d1) / 8});
  const double shrink = size > 0 ? std::clamp(std::sqrt(doubt / size), 2.0, 1e6) : 2.0;
  // Zero within round-off at another's event: the two are simultaneous and flip together.
  const bool crosses = g.v1 < -tolerance1 || (g.v1 < 0 && g.d1 < 0 && !rests && end == End::open);
  if (crosses) {
    if (!finest && doubt / 16 > std::max(std::abs(g.v0), std::abs(g.v1)) / 8) return {Outcome::unresolved, watch, 0, shrink};
    // The last sample still positive before the first negative one.
    double low = rests ? -1 : 0, high = 1, slope = 0;
    for (int k = 1; k <= 8; ++k) {
      const double value = g.quintic(k / 8.0, slope);
      if (value > 0) {
        low = k / 8.0;
      } else if (low >= 0) {
        high = k / 8.0;
        break;
      }
    }
    if (low < 0 || low >= 1) return finest ? Finding{Outcome::crossing, watch, 0, 2} : Finding{Outcome::unresolved, watch, 0, shrink};
    return {Outcome::crossing, watch, g.root(low, high), 2};
  }
  double where = 0;
  const double lowest = g.lowest(where);
  if (!rests && lowest > doubt / 16) return {};
  const double tolerance = std::max(tolerance0, tolerance1);
  if (lowest < -tolerance && -lowest > doubt / 4 && where > 0 && !rests) return {Outcome::crossing, watch, g.root(0, where), 2};
  if (finest) return {};  // touches within round-off, or rests: no event
  return {Outcome::unresolved, watch, 0, shrink};
}

/// Narrows a crossing found in a step of length h down to round-off: afterwards next_, guards1_ and the path stand at
/// the event and `found.root` is its time in seconds after x_. May return another watch, or unresolved.
ExactMarch::Finding ExactMarch::locate(double h, Finding found) {
  const double s = signs_[found.watch], unit = flow_->finest();
  double low = 0, high = h, tau = std::clamp(found.root, 0.0, 1.0) * h;
  double coefficients[Flow::order + 1];
  for (int round = 0; round < 80; ++round) {
    attempt(std::floor(tau / unit) * unit, -1);
    const double grid = std::floor(tau / unit) * unit;
    flow_->series(next_.data(), tail_terms_.data());
    for (int j = 0; j <= Flow::order; ++j) {
      coefficients[j] = s * flow_->watch_value(found.watch, tail_terms_.data() + static_cast<long>(j) * stride_);
    }
    const auto value = [&](double d, double& slope) {
      double v = 0;
      slope = 0;
      for (int j = Flow::order; j >= 0; --j) slope = slope * d + v, v = v * d + coefficients[j];
      return v;
    };
    // The series is good for one finest rung to either side.
    // The series is good for one finest rung to the left and two to the right. It may end a little beyond the bracket:
    // rung products and the series differ by round-off, and the series alone decides from here on.
    const double left = grid > 0 ? -unit : 0, right = 2 * unit;
    double slope = 0;
    const double at_left = value(left, slope);
    const double at_right = value(right, slope);
    if (at_right <= 0 && (at_left > 0 || grid <= 0)) {
      double d = std::clamp(tau - grid, left, right);
      double lower = left, upper = right;
      for (int i = 0; i < 100; ++i) {
        const double v = value(d, slope);
        if (v == 0) break;
        (v > 0 ? lower : upper) = d;
        double next = slope < 0 ? d - v / slope : lower;
        if (!(next > lower && next < upper)) next = 0.5 * (lower + upper);
        if (next == d || upper - lower <= 0) break;
        d = next;
      }
      tail_ = d;
      std::copy_n(tail_terms_.data() + static_cast<long>(Flow::order) * stride_, stride_, next_.data());
      for (int j = Flow::order - 1; j >= 0; --j) {
        const double* term = tail_terms_.data() + static_cast<long>(j) * stride_;
        for (int i = 0; i < stride_; ++i) next_[i] = term[i] + d * next_[i];
      }
      flow_->guards(next_.data(), guards1_.data());
      found.root = std::min(grid + d, h);
      return found;
    }
    if (at_right > 0) {
      low = std::min(std::max(low, grid + right), high);
    } else {
      high = std::max(std::min(high, grid + left), low);
    }
    const double v = value(0, slope);
    double next = slope < 0 ? grid - v / slope : -1;
    if (!(next > low && next < high)) next = 0.5 * (low + high);
    if (high - low <= 0 && next == tau) break;
    tau = next;
  }
  // The two ends differ by round-off only (rung products and series disagree about the sign): the event is at the far end.
  attempt(high, -1);
  found.root = high;
  return found;
}

void ExactMarch::accept(double h) {
  if (settings_.keep_moments) {
    if (static_cast<int>(moments_.topologies_.size()) <= flow_->topology().id) moments_.topologies_.resize(flow_->topology().id + 1);
    auto& mine = moments_.topologies_[flow_->topology().id];
    if (mine.rung_squares.empty()) mine.rung_squares.resize(Flow::top + 1);
    const double* from = x_.data();
    for (int p = 0; p < path_length_; ++p) {
      Buffer& squares = mine.rung_squares[path_rungs_[p]];
      if (squares.empty()) squares.assign(static_cast<std::size_t>(stride_) * n_, 0);
      add_square(squares.data(), stride_, n_, from, 1);
      from = path_[p].data();
    }
    if (tail_ != 0) {
      if (mine.rest.empty()) mine.rest.assign(static_cast<std::size_t>(stride_) * n_, 0);
      // Four Gauss points; the series has converged to round-off over the tail.
      constexpr double node[] = {0.06943184420297371, 0.33000947820757187, 0.6699905217924281, 0.9305681557970263};
      constexpr double weight[] = {0.17392742256872692, 0.32607257743127307, 0.32607257743127307, 0.17392742256872692};
      for (int q = 0; q < 4; ++q) {
        const double d = node[q] * tail_;
        std::copy_n(tail_terms_.data() + static_cast<long>(Flow::order) * stride_, stride_, scratch_.data());
        for (int j = Flow::order - 1; j >= 0; --j) {
          const double* term = tail_terms_.data() + static_cast<long>(j) * stride_;
          for (int i = 0; i < stride_; ++i) scratch_[i] = term[i] + d * scratch_[i];
        }
        add_square(mine.rest.data(), stride_, n_, scratch_.data(), weight[q] * tail_);
      }
    }
  }
  x_.swap(next_);
  guards0_.swap(guards1_);
  // Time in two words: thousands of steps must not cost digits of the instants that follow.
  const double before = state_->time, sum = before + h;
  const double part = sum - before;
  time_low_ += (before - (sum - part)) + (h - part);
  state_->time = sum + time_low_;
  time_low_ = time_low_ - (state_->time - sum);
  if (state_->time > before) standing_events_ = 0, recent_.clear();
  ++report_.steps;
}

MarchReport ExactMarch::run(MarchState& state, double until, Observer* observer) {
  const double began = now();
  report_ = MarchReport{};
  state_ = &state;
  std::copy_n(state.x.data(), n_, x_.begin());
  std::fill(x_.begin() + n_, x_.end(), 0.0);
  time_low_ = 0;
  standing_events_ = 0;
  recent_.clear();
  std::string trouble;
  enter(circuit_.topology(state.cells));
  Span span{&circuit_, &flow_->topology(), state.time, 0, nullptr, nullptr, this};
  Buffer shown(stride_);
  bool go_on = true;
  // A state handed over from another lap of the same drive may stand a rounding before a command that is due now.
  if (!apply_outside(observer)) {
    go_on = decide(trouble);
    if (!go_on) report_.reason = MarchReport::Reason::no_consistent_cells;
  }
  while (go_on) {
    // The nearest instant known from outside.
    double stop = std::min(until, circuit_.next_corner(state.time));
    for (std::size_t c = 0; c < circuit_.sheet().commands.size(); ++c) stop = std::min(stop, circuit_.next_toggle(static_cast<int>(c), state.time));
    bool event = false;
    while (!event && state.time < stop) {
      const double left = (stop - state.time) - time_low_;
      double h = std::min({left, settings_.step_ceiling, hint_});
      int rung = flow_->rung_below(h);
      // Land on the stop in one piece where that is no longer than the step wanted.
      const bool whole = h == left;
      if (whole) {
        rung = -1;
      } else if (rung < 0) {
        h = std::min(left, flow_->finest());
      } else {
        h = flow_->rung_length(rung);
      }
      attempt(h, rung);
      const bool finest = h <= flow_->finest();
      Finding found = check(h, guards0_.data(), guards1_.data(), x_.data(), next_.data(), -1, finest);
      if (found.outcome == Outcome::crossing) {
        double length = h;
        for (int again = 0; again < 16 && found.outcome == Outcome::crossing; ++again) {
          found = locate(length, found);
          if (found.outcome != Outcome::crossing) break;
          const Finding other = found.root > 0 ? check(found.root, guards0_.data(), guards1_.data(), x_.data(), next_.data(), found.watch,
                                                       found.root <= flow_->finest())
                                               : Finding{};
          if (other.outcome == Outcome::clear) {
            event = true;
            break;
          }
          length = found.root;
          found = other;
        }
        if (event) h = found.root;
      }
      if (!event && found.outcome != Outcome::clear) {
        ++report_.refused;
        hint_ = h / found.shrink;
        continue;
      }
      shown_from_ = x_.data();
      const double start = state.time;
      std::copy(x_.begin(), x_.end(), shown.begin());
      accept(h);
      if (h == left) state.time = stop, time_low_ = 0;
      if (!event) hint_ = std::max(hint_, growth * h);
      if (observer) {
        shown_from_ = shown.data();
        span.topology = &flow_->topology();
        span.start = start;
        span.duration = h;
        span.x0 = shown.data();
        span.x1 = x_.data();
        observer->span(span);
      }
      if (event) flip_event(observer, found.watch);
    }
    if (event) {
      go_on = decide(trouble);
      if (!go_on) report_.reason = MarchReport::Reason::no_consistent_cells;
      if (go_on && standing_events_ > most_standing_events) {
        report_.reason = MarchReport::Reason::events_pile_up;
        trouble = pile_up_sentence();
        go_on = false;
      }
    }
    if (go_on && state.time >= stop) {
      if (!apply_outside(observer)) {
        go_on = decide(trouble);
        if (!go_on) report_.reason = MarchReport::Reason::no_consistent_cells;
      }
      if (go_on && state.time >= until) {
        report_.reason = MarchReport::Reason::end_time;
        go_on = false;
      }
    }
    if (go_on && observer && observer->enough()) {
      report_.reason = MarchReport::Reason::observer;
      go_on = false;
    }
  }
  state.x = Eigen::Map<const Eigen::VectorXd>(x_.data(), n_);
  report_.topologies = circuit_.topologies_built();
  for (const auto& f : flows_) {
    if (f) report_.seconds_building += f->seconds_building();
  }
  report_.seconds = now() - began;
  switch (report_.reason) {
    case MarchReport::Reason::end_time: report_.sentence = fmt::format("reached {:.9g} s", until); break;
    case MarchReport::Reason::observer: report_.sentence = fmt::format("stopped at {:.9g} s as asked", state.time); break;
    default: report_.sentence = trouble;
  }
  return report_;
}

}  // namespace couplet
