// SPDX-License-Identifier: MIT
#include "engine/study/follow.h"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <cmath>

#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

class Follower {
 public:
  Follower(const Design& design, const FollowOptions& options) : design_(design), options_(options) {}
  Path run();

 private:
  /// A solved point: state in the coordinates of the first circuit, log of the value.
  struct Solved {
    Eigen::VectorXd y;
    MarchState start;   // with its bits; x in its own circuit's coordinates
    Orbit orbit;
    int steps = 0;
  };

  std::unique_ptr<Bench> bench_at(double log_value) const;
  bool correct(const Eigen::VectorXd& guess, const Eigen::VectorXd& tangent, const MarchState& bits, double period, bool fixed_value, Solved& solved);
  void add_point(const Solved& solved);
  void look_between(const Solved& a, const Solved& b);
  void look_for_fold(const Solved& a, const Solved& b, const Solved& c);
  double value(const Solved& s) const { return std::exp(s.y[s.y.size() - 1]); }

  const Design& design_;
  const FollowOptions& options_;
  Section section_;
  std::unique_ptr<Bench> reference_;
  double scale_ = 1;  // size of the state at the first point
  Path path_;
};

std::unique_ptr<Bench> Follower::bench_at(double log_value) const {
  Design design = design_;
  design.set(options_.along, std::exp(log_value));
  return std::make_unique<Bench>(design, section_, MarchSettings{});
}

/// Newton from `guess`. `tangent` (unit) and the guess define the plane that the solution must lie in; with
/// fixed_value the value stays as guessed.
bool Follower::correct(const Eigen::VectorXd& guess, const Eigen::VectorXd& tangent, const MarchState& bits, double period, bool fixed_value, Solved& solved) {
  const bool driven = section_.driven;
  Eigen::VectorXd y = guess;
  const int n = static_cast<int>(y.size()) - 1;
  MarchState seat = bits;
  double before = std::numeric_limits<double>::infinity();
  for (int iteration = 0; iteration < 12; ++iteration) {
    const auto bench = bench_at(y[n]);
    const Eigen::MatrixXd into = bench->circuit.into(reference_->circuit), back = reference_->circuit.into(bench->circuit);
    std::string trouble;
    if (!bench->lapper.seat(seat, back * (scale_ * y.head(n)), trouble)) return false;
    const Lap lap = bench->lapper.lap(seat, period, 1, true);
    if (!lap.returned) return false;
    const Eigen::VectorXd miss = into * lap.end.x.head(n) / scale_ - y.head(n);
    const double residual = miss.norm();
    const Eigen::VectorXd field = into * bench->lapper.field(lap.end) / scale_;
    const Eigen::MatrixXd monodromy = into * lap.monodromy * back;
    const bool done = residual < 1e-11 || (residual < 1e-9 && residual > 0.3 * before);
    if (done) {
      solved.y = y;
      solved.start = seat;
      solved.steps = iteration;
      solved.orbit = Orbit{};
      solved.orbit.kind = Orbit::Kind::plain;
      solved.orbit.start = seat;
      solved.orbit.period = lap.duration;
      solved.orbit.monodromy = lap.monodromy;
      solved.orbit.residual = residual;
      const Eigen::VectorXcd values = lap.monodromy.eigenvalues();
      std::vector<std::complex<double>> multipliers(values.data(), values.data() + values.size());
      if (!driven) {
        multipliers.erase(std::min_element(multipliers.begin(), multipliers.end(), [](auto a, auto b) { return std::abs(a - 1.0) < std::abs(b - 1.0); }));
      }
      std::sort(multipliers.begin(), multipliers.end(), [](auto a, auto b) { return std::abs(a) > std::abs(b); });
      solved.orbit.multipliers = multipliers;
      return true;
    }
    if (residual > 0.5 || residual > 4 * before) return false;
    before = residual;
    period = lap.duration;
    // Derivative by the log of the value: one more lap, compared at the same time.
    const double nudge = 1e-6;
    Eigen::VectorXd by_value = Eigen::VectorXd::Zero(n);
    if (!fixed_value) {
      const auto other = bench_at(y[n] + nudge);
      const Eigen::MatrixXd into_other = other->circuit.into(reference_->circuit);
      MarchState seat_other = bits;
      if (!other->lapper.seat(seat_other, reference_->circuit.into(other->circuit) * (scale_ * y.head(n)), trouble)) return false;
      const Lap moved = other->lapper.lap(seat_other, period, 1, false);
      if (!moved.returned) return false;
      by_value = (into_other * moved.end.x.head(n) / scale_ - (miss + y.head(n)) - (driven ? Eigen::VectorXd::Zero(n).eval() : (field * (moved.duration - lap.duration)).eval())) / nudge;
    }
    const int extra = driven ? 0 : 1;
    Eigen::MatrixXd J = Eigen::MatrixXd::Zero(n + extra + 1, n + extra + 1);
    Eigen::VectorXd right = Eigen::VectorXd::Zero(n + extra + 1);
    J.topLeftCorner(n, n) = Eigen::MatrixXd::Identity(n, n) - monodromy;
    J.block(0, n + extra, n, 1) = -by_value;
    right.head(n) = miss;
    if (!driven) {
      J.block(0, n, n, 1) = -field / field.norm();
      const Eigen::VectorXd row = back.transpose() * bench->lapper.section_row(seat) * scale_;
      J.block(n, 0, 1, n) = row.transpose() / row.norm();
      right[n] = -bench->lapper.section_value(seat) / row.norm();
    }
    if (fixed_value) {
      J(n + extra, n + extra) = 1;
    } else {
      J.block(n + extra, 0, 1, n) = tangent.head(n).transpose();
      J(n + extra, n + extra) = tangent[n];
      right[n + extra] = -tangent.dot(y - guess);
    }
    const Eigen::VectorXd step = J.partialPivLu().solve(right);
    if (!step.allFinite()) return false;
    y.head(n) += step.head(n);
    y[n] += step[n + extra];
  }
  return false;
}

void Follower::add_point(const Solved& solved) {
  const auto bench = bench_at(solved.y[solved.y.size() - 1]);
  PathPoint point;
  point.value = value(solved);
  point.period = solved.orbit.period;
  point.multiplier = solved.orbit.multipliers.empty() ? 0 : solved.orbit.multipliers.front();
  point.stable = std::abs(point.multiplier) <= 1 + 1e-9;
  point.newton_steps = solved.steps;
  point.figures = orbit_figures(*bench, solved.orbit);
  path_.points.push_back(std::move(point));
  if (options_.progress) {
    const double share = std::log(path_.points.back().value / options_.from) / std::log(options_.to / options_.from);
    options_.progress(std::clamp(share, 0.0, 1.0));
  }
}

/// Stability changes between two neighbours: the value is narrowed by halving the chord between them.
void Follower::look_between(const Solved& a, const Solved& b) {
  const auto largest = [](const Solved& s) { return s.orbit.largest_multiplier(); };
  const bool stable_a = largest(a) <= 1 + 1e-9, stable_b = largest(b) <= 1 + 1e-9;
  if (stable_a == stable_b) return;
  Solved low = a, high = b;
  Eigen::VectorXd tangent = (b.y - a.y).normalized();
  for (int k = 0; k < 40 && std::abs(low.y[low.y.size() - 1] - high.y[high.y.size() - 1]) > 2e-7; ++k) {
    const double fa = largest(low) - 1, fb = largest(high) - 1;
    const double t = std::clamp(fa / (fa - fb), 0.1, 0.9);
    Solved middle;
    if (!correct(low.y + t * (high.y - low.y), tangent, low.start, low.orbit.period, false, middle)) break;
    ((largest(middle) <= 1 + 1e-9) == stable_a ? low : high) = middle;
  }
  const auto& m = (stable_a ? high : low).orbit.multipliers.front();
  PathMark mark;
  mark.value = value(low);
  mark.frequency = 1 / low.orbit.period;
  const std::string what = std::abs(m.imag()) > 1e-6 ? "a slow oscillation of the envelope sets in (complex pair of multipliers)"
                           : m.real() < 0            ? "period doubling: beyond, it repeats after two returns only"
                                                     : "a multiplier passes +1: the branch exchanges stability (fold, or two mirror states)";
  mark.words = stable_a ? what : "stable again: " + what;
  path_.marks.push_back(mark);
}

/// The value turned back around b: the extreme of the parabola through the three points, narrowed by solving again.
void Follower::look_for_fold(const Solved& first, const Solved& second, const Solved& third) {
  Solved a = first, b = second, c = third;
  const int n = static_cast<int>(b.y.size()) - 1;
  const double sign = b.y[n] > a.y[n] ? 1 : -1;
  for (int k = 0; k < 12; ++k) {
    const double s1 = (b.y - a.y).norm(), s2 = s1 + (c.y - b.y).norm();
    const double pa = a.y[n], pb = b.y[n], pc = c.y[n];
    // Extreme of the parabola p(s) through (0, pa), (s1, pb), (s2, pc).
    const double d1 = (pb - pa) / s1, d2 = (pc - pb) / (s2 - s1), curve = (d2 - d1) / s2;
    if (curve == 0) break;
    const double s = 0.5 * (s1 - d1 / curve);
    if (!(s > 0 && s < s2) || std::abs(s - s1) < 1e-3 * s2) break;
    const bool left = s < s1;
    const Eigen::VectorXd guess = left ? (a.y + (s / s1) * (b.y - a.y)).eval() : (b.y + ((s - s1) / (s2 - s1)) * (c.y - b.y)).eval();
    Solved middle;
    if (!correct(guess, (c.y - a.y).normalized(), b.start, b.orbit.period, false, middle)) break;
    const double moved = std::abs(middle.y[n] - b.y[n]);
    if (sign * middle.y[n] >= sign * b.y[n]) {
      (left ? c : a) = b;
      b = middle;
    } else {
      (left ? a : c) = middle;
    }
    if (moved < 1e-8) break;
  }
  path_.marks.push_back({value(b), 1 / b.orbit.period, "fold: the path turns back; past this value the state jumps to another branch"});
}

Path Follower::run() {
  const double began = now();
  path_.along = options_.along;
  const Quantity quantity = design_.get(options_.along);
  path_.unit = quantity.unit;
  if (!(options_.from > 0 && options_.to > 0)) throw InputError("--from and --to must be positive: the path is stepped in the logarithm of the value");
  if (options_.from == options_.to) throw InputError("--from and --to are the same; give a range");
  Design first = design_;
  first.set(options_.along, options_.from);
  SteadyState cold = run_settle(first);
  section_ = cold.section;
  if (cold.orbit.kind != Orbit::Kind::plain) {
    path_.sentence = "nothing to follow at the first value: " + cold.orbit.sentence;
    return path_;
  }
  const int n = cold.bench->circuit.states();
  reference_ = std::move(cold.bench);
  scale_ = cold.orbit.start.x.head(n).norm();
  Solved a;
  a.y.resize(n + 1);
  a.y << cold.orbit.start.x.head(n) / scale_, std::log(options_.from);
  a.start = cold.orbit.start;
  a.orbit = cold.orbit;
  add_point(a);
  const double target = std::log(options_.to), direction = options_.to > options_.from ? 1 : -1;
  double ds = 0.02;
  Eigen::VectorXd tangent = Eigen::VectorXd::Zero(n + 1);
  tangent[n] = direction;
  Solved before = a, current = a;
  bool two = false;
  while (static_cast<int>(path_.points.size()) < options_.most_points) {
    Solved next;
    const Eigen::VectorXd guess = current.y + ds * tangent;
    const bool good = correct(guess, tangent, current.start, current.orbit.period, false, next) && (next.y - guess).norm() < 0.5 * ds;
    if (!good) {
      ++path_.refused;
      ds /= 3;
      if (ds < 1e-7) {
        path_.sentence = fmt::format("the path ends at {} = {}: no orbit was found beyond", options_.along, print_quantity(value(current), path_.unit, 8));
        path_.marks.push_back({value(current), 1 / current.orbit.period, "end of the path: no neighbouring orbit was found beyond"});
        break;
      }
      continue;
    }
    if (direction * (next.y[n] - target) >= 0) {
      Solved last;
      const double share = (target - current.y[n]) / (next.y[n] - current.y[n]);
      Eigen::VectorXd at_end = current.y + share * (next.y - current.y);
      at_end[n] = target;
      if (correct(at_end, tangent, current.start, current.orbit.period, true, last)) look_between(current, last), add_point(last);
      path_.reached = true;
      path_.sentence = fmt::format("reached {} = {}", options_.along, print_quantity(options_.to, path_.unit, 6));
      break;
    }
    look_between(current, next);
    if (two && (current.y[n] - before.y[n]) * (next.y[n] - current.y[n]) < 0) look_for_fold(before, current, next);
    add_point(next);
    if (direction * (next.y[n] - std::log(options_.from)) < -1e-9) {
      path_.sentence = fmt::format("the path came back to {} = {} on another branch", options_.along, print_quantity(options_.from, path_.unit, 6));
      break;
    }
    before = current;
    current = next;
    two = true;
    tangent = (current.y - before.y).normalized();
    if (next.steps <= 4) ds = std::min(ds * 1.6, 0.1);
  }
  if (path_.sentence.empty()) path_.sentence = fmt::format("stopped after {} points", path_.points.size());
  path_.seconds = now() - began;
  return path_;
}

}  // namespace

Path follow(const Design& design, const FollowOptions& options) { return Follower(design, options).run(); }

}  // namespace couplet
