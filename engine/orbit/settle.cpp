// SPDX-License-Identifier: MIT
#include "engine/orbit/settle.h"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <cmath>

namespace couplet {
namespace {

constexpr double good = 1e-11;      // relative residual at which an orbit is found
constexpr double floor_ = 1e-8;     // below it, no further shrinking is the floor of round-off
constexpr int most_laps = 900;

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

/// Shooting on `returns` returns from a state on the section. The phrases of the header's paragraph are its members.
class Shooting {
 public:
  Shooting(Lapper& lapper, int returns, double period) : lapper_(lapper), returns_(returns), period_(period) {}

  /// True where an orbit was found: then state(), period(), lap() hold it.
  bool run(MarchState start, bool warm) {
    state_ = std::move(start);
    lap_ = lapper_.lap(state_, period_, returns_, true);
    double leap = warm ? std::numeric_limits<double>::infinity() : 4;
    if (!lap_.returned) return trouble_ = lap_.trouble, false;
    for (long begun = lapper_.laps; lapper_.laps - begun < most_laps;) {
      const double r = residual(lap_, state_);
      residuals.push_back(r / size());
      if (r <= good * size() || (residuals.size() > 3 && r <= floor_ * size() && r > 0.5 * residuals[residuals.size() - 2] * size())) return true;
      Eigen::VectorXd newton = step(std::numeric_limits<double>::infinity());
      const bool close = newton.norm() < 1e-4 * size();
      const Eigen::VectorXd dx = close || std::isinf(leap) ? newton : step(leap);
      Lap tried = attempt(dx);
      if (tried.returned && residual(tried, seated_) < (close ? 1.01 : 1.5) * r) {
        const double ratio = r / std::max(residual(tried, seated_), 1e-300);
        take(std::move(tried));
        leap *= std::clamp(2.5 * ratio, 1.5, 20.0);
        continue;
      }
      if (warm) return trouble_ = "the neighbour's orbit does not lead here", false;
      if (close && r <= floor_ * size()) return true;
      // March on from there; accept once it comes nearer.
      bool accepted = false;
      if (tried.returned) {
        MarchState from = tried.end;
        for (int k = 0; k < 30 && !accepted; ++k) {
          Lap next = lapper_.lap(from, period_, returns_, k % 5 == 4);
          if (!next.returned) break;
          if (k % 5 == 4 && residual(next, from) < 1.1 * r) {
            seated_ = from;
            take(std::move(next));
            accepted = true;
          }
          from = next.end;
        }
      }
      if (accepted) continue;
      if (leap > 1.5 && std::isfinite(leap)) {
        leap = std::max(leap / 5, 1.0);
      } else if (std::isinf(leap)) {
        leap = 4;
      } else if (!march_on(10)) {
        return false;
      }
    }
    trouble_ = "the residual did not fall";
    return false;
  }

  const MarchState& state() const { return state_; }
  const Lap& lap() const { return lap_; }
  double period() const { return period_; }
  const std::string& trouble() const { return trouble_; }
  double relative() const { return residual(lap_, state_) / size(); }
  std::vector<double> residuals;

 private:
  Eigen::VectorXd xi(const MarchState& s) const { return s.x.head(lapper_.circuit().states()); }
  double size() const { return std::max(xi(state_).norm(), 1e-300); }
  double residual(const Lap& lap, const MarchState& from) const { return (xi(lap.end) - xi(from)).norm(); }

  /// The bordered system of the header.
  Eigen::VectorXd step(double leap) const {
    const int n = lapper_.circuit().states();
    const bool driven = lapper_.section().driven;
    Eigen::MatrixXd J = Eigen::MatrixXd::Zero(n + !driven, n + !driven);
    Eigen::VectorXd right = Eigen::VectorXd::Zero(n + !driven);
    J.topLeftCorner(n, n) = -lap_.monodromy;
    J.topLeftCorner(n, n).diagonal().array() += 1 + 1 / leap;
    right.head(n) = xi(lap_.end) - xi(state_);
    if (!driven) {
      // The unknown period change is scaled so that its column is as large as the others.
      const Eigen::VectorXd f = lapper_.field(lap_.end), c = lapper_.section_row(state_);
      J.topRightCorner(n, 1) = -f / f.norm();
      J.bottomLeftCorner(1, n) = c.transpose() / c.norm();
      right[n] = -lapper_.section_value(state_) / c.norm();
    }
    return J.partialPivLu().solve(right).head(n);
  }

  Lap attempt(const Eigen::VectorXd& dx) {
    seated_ = state_;
    Lap none;
    if (!dx.allFinite()) return none;
    if (!lapper_.seat(seated_, xi(state_) + dx, none.trouble)) return none;
    return lapper_.lap(seated_, period_, returns_, true);
  }

  void take(Lap lap) {
    state_ = seated_;
    lap_ = std::move(lap);
    period_ = lap_.duration / returns_;
  }

  bool march_on(int laps) {
    MarchState from = lap_.end;
    for (int k = 0; k < laps; ++k) {
      Lap next = lapper_.lap(from, period_, returns_, k + 1 == laps);
      if (!next.returned) return trouble_ = next.trouble, false;
      if (k + 1 == laps) {
        seated_ = from;
        take(std::move(next));
        return true;
      }
      from = next.end;
    }
    return true;
  }

  Lapper& lapper_;
  int returns_;
  double period_;
  MarchState state_, seated_;
  Lap lap_;
  std::string trouble_;
};

void find_multipliers(Orbit& orbit, const Lapper& lapper) {
  const Eigen::VectorXcd values = orbit.monodromy.eigenvalues();
  orbit.multipliers.assign(values.data(), values.data() + values.size());
  if (!lapper.section().driven && !orbit.multipliers.empty()) {
    const auto nearest = std::min_element(orbit.multipliers.begin(), orbit.multipliers.end(), [](auto a, auto b) { return std::abs(a - 1.0) < std::abs(b - 1.0); });
    orbit.trivial_error = std::abs(*nearest - 1.0);
    orbit.multipliers.erase(nearest);
    const Eigen::VectorXd f = lapper.field(orbit.start);
    orbit.field_error = (orbit.monodromy * f - f).norm() / f.norm();
  }
  std::sort(orbit.multipliers.begin(), orbit.multipliers.end(), [](auto a, auto b) {
    return std::abs(a) != std::abs(b) ? std::abs(a) > std::abs(b) : a.imag() > b.imag();
  });
}

void take_orbit(Orbit& orbit, const Shooting& shooting, const Lapper& lapper, int returns) {
  orbit.start = shooting.state();
  orbit.period = shooting.lap().duration;
  orbit.returns = returns;
  orbit.monodromy = shooting.lap().monodromy;
  orbit.residual = shooting.relative();
  orbit.residuals = shooting.residuals;
  find_multipliers(orbit, lapper);
}

/// Marches from rest to a state on the section where two returns agree within 5 %; false where it never returns.
bool approach(Lapper& lapper, double patience, MarchState& state, double& period, std::string& trouble) {
  const Circuit& circuit = lapper.circuit();
  ExactMarch& march = lapper.march();
  const MarchState rest = march.stand(circuit.start_state(), 0);
  state = rest;
  class Returns : public Observer {
   public:
    explicit Returns(double after) : after_(after) {}
    void event(const Event& e) override {
      if (e.kind == Event::Kind::probe && e.condition == 0 && e.bit) ++count, last = e.time, latest = e.time > after_;
    }
    bool enough() const override { return latest; }
    double after_, last = 0;
    long count = 0;
    bool latest = false;
  };
  const double base = lapper.base();
  if (lapper.section().driven) {
    period = lapper.section().period;
    const double until = base + std::ceil(30.0) * period;
    const MarchReport report = march.run(state, until, nullptr);
    if (!report.usable()) return trouble = report.sentence, false;
    return true;
  }
  if (base > 0) {
    const MarchReport report = march.run(state, base, nullptr);
    if (!report.usable()) return trouble = report.sentence, false;
  }
  double before = 0, gap = 0;
  const double end = base + patience;
  for (int k = 0; k < 100000; ++k) {
    Returns returns(state.time);
    const MarchReport report = march.run(state, end, &returns);
    if (!report.usable()) return trouble = report.sentence, false;
    if (report.reason != MarchReport::Reason::observer) break;
    const double next = returns.last - before;
    const bool alike = k > 30 && std::abs(next - gap) < 0.05 * next;
    gap = next;
    before = returns.last;
    if (alike) return period = gap, true;
  }
  period = gap;
  trouble = "it never returned twice alike";
  return false;
}

std::string rest_words(const Lapper& lapper, const MarchState& state) {
  std::string words;
  const Sheet& sheet = lapper.circuit().sheet();
  for (std::size_t b = 0; b < sheet.branches.size(); ++b) {
    if (sheet.parts[sheet.branches[b].part].kind != "fet" || sheet.branches[b].name != sheet.parts[sheet.branches[b].part].name) continue;
    words += fmt::format("{}{} is {}", words.empty() ? "" : ", ", sheet.branches[b].name, sheet.branches[b].cells[state.cells[b]].state);
  }
  return words;
}

/// Where the swing died: the equilibrium of the last topology, when it lies in its own cells and is stable.
bool find_rest(Lapper& lapper, const MarchState& state, Orbit& orbit) {
  const Circuit& circuit = lapper.circuit();
  const Topology& topology = circuit.topology(state.cells);
  const int n = circuit.states();
  const Eigen::MatrixXd A = topology.A.topLeftCorner(n, n);
  const Eigen::VectorXd drive = topology.A.topRightCorner(n, circuit.inputs()) * circuit.inputs_at(lapper.base());
  MarchState rest = state;
  rest.x.head(n) = A.fullPivLu().solve(-drive);
  rest.x.tail(circuit.inputs()) = circuit.inputs_at(lapper.base());
  if (!rest.x.allFinite()) return false;
  const Eigen::VectorXd values = topology.watch_rows * rest.x;
  for (std::size_t i = 0; i < topology.watches.size(); ++i) {
    if (topology.watches[i].branch >= 0 && (values[static_cast<int>(i)] > 0) != topology.watches[i].bit) return false;
  }
  const Eigen::VectorXcd rates = A.eigenvalues();
  if (rates.real().maxCoeff() > 0) return false;
  orbit.kind = Orbit::Kind::rest;
  orbit.start = rest;
  orbit.sentence = "does not oscillate: at rest, " + rest_words(lapper, state);
  return true;
}

/// Smallest number of returns after which the march repeats, 0 where none up to 40 does.
int repetition(Lapper& lapper, MarchState& state, double& period, double patience) {
  std::vector<Eigen::VectorXd> seen;
  std::vector<MarchState> states;
  const int n = lapper.circuit().states();
  const int wanted = static_cast<int>(std::clamp(patience / period, 400.0, 4000.0));
  MarchState from = state;
  for (int k = 0; k < wanted; ++k) {
    Lap lap = lapper.lap(from, period, 1, false);
    if (!lap.returned) return 0;
    from = lap.end;
    if (k + 120 < wanted) continue;
    seen.push_back(from.x.head(n));
    states.push_back(from);
  }
  for (int m = 1; m <= 40 && m < static_cast<int>(seen.size()); ++m) {
    const double off = (seen.back() - seen[seen.size() - 1 - m]).norm();
    if (off > 1e-5 * seen.back().norm()) continue;
    state = states.back();
    return m;
  }
  state = from;
  return 0;
}

}  // namespace

Orbit settle(Lapper& lapper, const SettleOptions& options, const MarchState* guess, double guess_period) {
  const double began = now();
  const long laps_before = lapper.laps;
  Orbit orbit;
  const auto finish = [&]() -> Orbit {
    orbit.laps = lapper.laps - laps_before;
    orbit.seconds = now() - began;
    return orbit;
  };
  MarchState state;
  double period = guess_period;
  std::string trouble;
  if (guess) {
    state = *guess;
    if (!lapper.seat(state, guess->x.head(lapper.circuit().states()), trouble)) return orbit.sentence = trouble, finish();
  } else if (!approach(lapper, options.patience, state, period, trouble)) {
    if (find_rest(lapper, state, orbit)) return finish();
    if (period <= 0) {
      orbit.sentence = "no oscillation was found: " + trouble;
      return finish();
    }
  }
  const auto plain = [&](const Shooting& shooting, int returns) {
    take_orbit(orbit, shooting, lapper, returns);
    orbit.kind = returns == 1 ? Orbit::Kind::plain : Orbit::Kind::several_returns;
    orbit.sentence = fmt::format("residual {:.1e} after {} laps{}", orbit.residual, lapper.laps - laps_before, returns > 1 ? fmt::format("; repeats after {} returns only", returns) : "");
  };
  for (int round = 0; round < 3; ++round) {
    Shooting shooting(lapper, 1, period);
    if (!shooting.run(state, options.guess_only)) {
      orbit.sentence = shooting.trouble();
      if (options.guess_only) return finish();
      break;
    }
    plain(shooting, 1);
    if (orbit.largest_multiplier() <= 1 + 1e-9 || options.guess_only) {
      if (orbit.largest_multiplier() > 1 + 1e-9) orbit.kind = Orbit::Kind::unstable;
      return finish();
    }
    orbit.notes.push_back(fmt::format("an unstable orbit was met (period {:.6g} s, largest multiplier {:.6g}): real, but no bench shows it", orbit.period, orbit.largest_multiplier()));
    // Nudge it and march: where does it go?
    MarchState nudged = orbit.start;
    Eigen::VectorXd xi = nudged.x.head(lapper.circuit().states());
    for (int i = 0; i < xi.size(); ++i) xi[i] *= i % 2 ? 1.01 : 0.99;
    if (!lapper.seat(nudged, xi, trouble)) break;
    bool alive = true;
    for (int k = 0; k < 400 && alive; ++k) {
      Lap lap = lapper.lap(nudged, period, 1, false);
      alive = lap.returned;
      if (alive) nudged = lap.end;
    }
    if (!alive) break;
    state = nudged;
  }
  // No plain stable orbit: perhaps one of several returns, perhaps none.
  int returns = 0;
  if (!guess && !approach(lapper, options.patience, state, period, trouble)) {
    if (find_rest(lapper, state, orbit)) return finish();
  }
  returns = repetition(lapper, state, period, options.patience);
  if (returns > 0) {
    Shooting shooting(lapper, returns, period);
    if (shooting.run(state, false)) {
      plain(shooting, returns);
      if (orbit.largest_multiplier() <= 1 + 1e-9) return finish();
      orbit.kind = Orbit::Kind::unstable;
      orbit.sentence = "only an unstable orbit was found";
      return finish();
    }
  }
  if (find_rest(lapper, state, orbit)) return finish();
  orbit.kind = Orbit::Kind::not_periodic;
  orbit.start = state;
  orbit.period = period;
  orbit.sentence = "does not repeat within 40 returns";
  return finish();
}

}  // namespace couplet
