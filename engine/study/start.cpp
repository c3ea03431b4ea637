// SPDX-License-Identifier: MIT
#include "engine/study/start.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "engine/march/exact.h"
#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

/// Times of the section's crossings, the rail there, and whether to stop at the next one.
class Returns : public Observer {
 public:
  Returns(const Circuit* circuit, Node rail, std::vector<std::pair<double, double>>& list) : circuit_(circuit), rail_(rail), list_(list) {}
  void event(const Event& event) override {
    if (event.kind != Event::Kind::probe || !event.bit) return;
    double rail = 0;
    if (rail_ > 0) {
      rail = event.after->C.row(circuit_->row_of_node(rail_)).dot(Eigen::Map<const Eigen::VectorXd>(event.x, circuit_->size()));
    }
    list_.push_back({event.time, rail});
    ++count;
  }
  bool enough() const override { return count >= stop_after; }
  long count = 0, stop_after = std::numeric_limits<long>::max();
  void follow(const Circuit* circuit) { circuit_ = circuit; }

 private:
  const Circuit* circuit_;
  Node rail_;
  std::vector<std::pair<double, double>>& list_;
};

class Fan : public Observer {
 public:
  std::vector<Observer*> all;
  std::function<void(double share)> progress;
  double duration = 1;
  void span(const Span& span) override {
    for (auto* o : all) o->span(span);
    if (progress && ++spans_ % 1024 == 0) progress(span.start / duration);
  }
  void event(const Event& event) override {
    for (auto* o : all) o->event(event);
  }
  bool enough() const override {
    return std::any_of(all.begin(), all.end(), [](const Observer* o) { return o->enough(); });
  }

 private:
  long spans_ = 0;
};

/// Energies for marches without moments: Gauss points on the spans' interpolants.
class SampledMoments : public Observer {
 public:
  explicit SampledMoments(const Circuit& circuit) : n_(circuit.size()), x_(circuit.size()) {}
  void span(const Span& span) override {
    if (static_cast<int>(integrals.size()) <= span.topology->id) integrals.resize(span.topology->id + 1);
    auto& W = integrals[span.topology->id];
    if (W.size() == 0) W = Eigen::MatrixXd::Zero(n_, n_);
    constexpr double node[] = {0.1127016653792583, 0.5, 0.8872983346207417}, weight[] = {5.0 / 18, 8.0 / 18, 5.0 / 18};
    for (int q = 0; q < 3; ++q) {
      span.between->at(node[q] * span.duration, x_.data());
      W.noalias() += weight[q] * span.duration * x_ * x_.transpose();
    }
  }
  std::vector<Eigen::MatrixXd> integrals;

 private:
  int n_;
  Eigen::VectorXd x_;
};

void merge(std::vector<Extremes::Range>& into, const std::vector<Extremes::Range>& from) {
  if (into.empty()) into.resize(from.size());
  for (std::size_t i = 0; i < from.size(); ++i) {
    if (from[i].low < into[i].low) into[i].low = from[i].low, into[i].low_when = from[i].low_when;
    if (from[i].high > into[i].high) into[i].high = from[i].high, into[i].high_when = from[i].high_when;
  }
}

/// One start-up; the phrases of run() are its members.
class StartRun {
 public:
  StartRun(const Design& design, StartOptions options) : design_(design), options_(std::move(options)) {}
  StartResult run();

 private:
  void plan();
  void begin_stage(double time, bool first);
  bool leg(double until, long crossings);  // false: the march failed
  void fold_moments();
  bool window();
  void summarise();
  std::string standing_words() const;

  const Design& design_;
  StartOptions options_;
  StartResult result_;
  std::vector<double> stage_ends_;
  std::unique_ptr<Circuit> circuit_;
  std::unique_ptr<March> march_;
  ExactMarch* exact_ = nullptr;
  std::unique_ptr<Quantities> quantities_;
  std::unique_ptr<Extremes> extremes_;
  std::unique_ptr<SampledMoments> sampled_;
  std::unique_ptr<Returns> returns_;
  std::vector<Extremes::Range> highest_;
  std::vector<Eigen::MatrixXd> window_integrals_;
  MarchState state_;
  Fan fan_;
  double stored_at_fold_ = 0;
  bool in_window_ = false;
  double window_stored_ = 0, window_stored_end_ = 0;
};

void StartRun::plan() {
  const Sheet bare = build_sheet(design_, 0);
  const Circuit circuit(bare);
  const double natural = natural_period(circuit);
  result_.duration = options_.duration > 0 ? options_.duration : design_.run.duration.value_or(800 * natural);
  if (!(result_.duration > 0)) throw InputError(design_.file + ": nothing sets how long to march; give [run] duration = \"...\"");
  if (!options_.duration && !design_.run.duration) {
    result_.notes.push_back(fmt::format("no duration is given; marched {} (800 natural periods at rest)", print_quantity(result_.duration, "s")));
  }
  result_.section = options_.section;
  if (result_.section.words.empty() && result_.section.problem.empty()) {
    result_.section = find_section(bare, design_.run.section, result_.duration);
  }
  for (const auto& entry : design_.schedule) {
    if (entry.time.value < result_.duration) stage_ends_.push_back(entry.time.value);
  }
  stage_ends_.push_back(result_.duration);
}

void StartRun::begin_stage(double time, bool first) {
  Sheet sheet = build_sheet(design_, time);
  if (!result_.section.driven && result_.section.problem.empty()) sheet.probes.push_back({"section", result_.section.form});
  auto next = std::make_unique<Circuit>(std::move(sheet));
  MarchSettings settings = options_.march;
  settings.keep_moments = true;
  if (design_.run.step_ceiling) settings.step_ceiling = *design_.run.step_ceiling;
  std::unique_ptr<March> march = options_.ida ? ida_march(*next, settings) : exact_march(*next, settings);
  if (first) {
    state_ = march->stand(next->start_state(), 0);
  } else {
    const Eigen::VectorXd w = circuit_->topology(state_.cells).C * state_.x;
    const double before = stored_energy(*circuit_, w);
    state_ = march->stand(next->carry_over(*circuit_, w), time);
    const Eigen::VectorXd after_w = next->topology(state_.cells).C * state_.x;
    // Opening a gap or swapping a capacitor does work on the fields; the ledger shows it.
    result_.ledger.scheduled += stored_energy(*next, after_w) - before;
  }
  if (extremes_) merge(highest_, extremes_->ranges());
  // Observers may still look at the circuit before, until on_circuit has told them of the new one.
  const std::unique_ptr<March> march_before = std::move(march_);
  const std::unique_ptr<Circuit> circuit_before = std::move(circuit_);
  circuit_ = std::move(next);
  march_ = std::move(march);
  exact_ = dynamic_cast<ExactMarch*>(march_.get());
  quantities_ = std::make_unique<Quantities>(*circuit_, roles_of(design_, circuit_->sheet()));
  extremes_ = std::make_unique<Extremes>(*quantities_);
  if (!returns_) {
    returns_ = std::make_unique<Returns>(circuit_.get(), quantities_->roles().rail, result_.returns);
  } else {
    returns_->follow(circuit_.get());
  }
  fan_.all = {extremes_.get(), returns_.get()};
  fan_.progress = options_.progress;
  fan_.duration = result_.duration;
  if (!exact_) {
    sampled_ = std::make_unique<SampledMoments>(*circuit_);
    fan_.all.push_back(sampled_.get());
  }
  for (auto* o : options_.observers) fan_.all.push_back(o);
  stored_at_fold_ = stored_energy(*circuit_, circuit_->topology(state_.cells).C * state_.x);
  if (options_.on_circuit) options_.on_circuit(*circuit_, time);
}

/// Adds what the moments hold to the ledger (and to the window's integrals), and empties them.
void StartRun::fold_moments() {
  auto integrals = exact_ ? exact_->moment_integrals() : sampled_->integrals;
  const double stored = stored_energy(*circuit_, circuit_->topology(state_.cells).C * state_.x);
  const EnergyAccount part = account(*circuit_, integrals, stored_at_fold_, stored);
  const double scheduled = result_.ledger.scheduled;
  result_.ledger.add(part);
  result_.ledger.scheduled = scheduled;
  stored_at_fold_ = stored;
  if (in_window_) {
    if (window_integrals_.size() < integrals.size()) window_integrals_.resize(integrals.size());
    for (std::size_t i = 0; i < integrals.size(); ++i) {
      if (integrals[i].size() == 0) continue;
      if (window_integrals_[i].size() == 0) {
        window_integrals_[i] = integrals[i];
      } else {
        window_integrals_[i] += integrals[i];
      }
    }
  }
  if (exact_) {
    exact_->moments().clear();
  } else {
    sampled_->integrals.clear();
  }
}

bool StartRun::leg(double until, long crossings) {
  if (until <= state_.time) return true;
  returns_->stop_after = crossings < 0 ? std::numeric_limits<long>::max() : returns_->count + crossings;
  const MarchReport r = march_->run(state_, until, &fan_);
  MarchReport& sum = result_.report;
  sum.steps += r.steps, sum.refused += r.refused, sum.events += r.events, sum.commands += r.commands, sum.corners += r.corners;
  sum.topologies = std::max(sum.topologies, r.topologies);
  sum.seconds += r.seconds;
  sum.seconds_building = std::max(sum.seconds_building, r.seconds_building);
  sum.reason = r.reason;
  sum.sentence = r.sentence;
  return r.usable();
}

/// The window of the figures: the last whole periods before the end. False where the march failed.
bool StartRun::window() {
  const long wanted = design_.run.window_periods.value_or(20);
  const double end = result_.duration;
  const auto open = [&] {
    fold_moments();
    in_window_ = true;
    merge(highest_, extremes_->ranges());
    extremes_->clear();
    window_stored_ = stored_at_fold_;
    result_.window_from = state_.time;
  };
  const auto close = [&](long periods) {
    fold_moments();
    in_window_ = false;
    result_.window_to = state_.time;
    result_.window_periods = periods;
    window_stored_end_ = stored_at_fold_;
  };
  if (result_.section.driven && result_.section.period > 0) {
    const double period = result_.section.period;
    const double last = std::floor(end / period * (1 + 1e-12)) * period;
    const double periods = std::min<double>(wanted, std::floor((last - state_.time) / period));
    if (!leg(last - periods * period, -1)) return false;
    open();
    if (!leg(last, -1)) return false;
    close(static_cast<long>(periods));
    result_.oscillates = true;
    return leg(end, -1);
  }
  // Free: march most of the way, take the period from the last crossings, leave room for the window.
  if (!leg(state_.time + 0.6 * (end - state_.time), -1)) return false;
  auto& r = result_.returns;
  const auto period = [&] {
    return r.size() > 8 ? (r.back().first - r[r.size() - 9].first) / 8 : 0.0;
  };
  const double quiet = 0.2 * end;
  if (period() > 0 && state_.time - r.back().first < quiet) {
    if (!leg(std::max(state_.time, end - (wanted + 3) * 1.05 * period()), -1)) return false;
    if (!leg(end, 1)) return false;  // to the next crossing
    const bool at_crossing = !r.empty() && r.back().first == state_.time;
    open();
    const long before = returns_->count;
    if (at_crossing && !leg(end, wanted)) return false;
    const long periods = returns_->count - before;
    if (!at_crossing && !leg(end, -1)) return false;
    close(periods);
    result_.oscillates = periods > 0 && r.back().first == state_.time;
    if (!result_.oscillates) result_.window_periods = 0;
    return leg(end, -1);
  }
  if (!leg(std::max(state_.time, 0.95 * end), -1)) return false;
  open();
  if (!leg(end, -1)) return false;
  close(0);
  return true;
}

std::string StartRun::standing_words() const {
  // What the switches do says whether it rests or hangs.
  std::string words;
  for (std::size_t b = 0; b < circuit_->sheet().branches.size(); ++b) {
    const Branch& branch = circuit_->sheet().branches[b];
    if (circuit_->sheet().parts[branch.part].kind != "fet" || branch.name != circuit_->sheet().parts[branch.part].name) continue;
    words += fmt::format("{}{} is {}", words.empty() ? "" : ", ", branch.name, branch.cells[state_.cells[b]].state);
  }
  return words.empty() ? "nothing switches" : words;
}

void StartRun::summarise() {
  auto& figures = result_.figures;
  if (result_.window_to > result_.window_from) {
    WindowData data;
    data.duration = result_.window_to - result_.window_from;
    data.periods = static_cast<double>(result_.window_periods);
    data.integrals = window_integrals_;
    data.stored_before = window_stored_;
    data.stored_after = window_stored_end_;
    figures = window_figures(*quantities_, *extremes_, data);
  }
  merge(highest_, extremes_->ranges());
  // The legs' stored energies leave out the jumps at scheduled changes: count them on both sides.
  result_.ledger.stored_change += result_.ledger.scheduled;
  figures.set("ledger.residual", result_.ledger.relative(), "1");
  for (std::size_t p = 0; p < circuit_->sheet().parts.size() && !highest_.empty(); ++p) {
    const std::string& name = circuit_->sheet().parts[p].name;
    const auto set = [&](const char* what, const Extremes::Range& r, const char* unit) {
      const bool low = std::abs(r.low) > std::abs(r.high);
      figures.set(name + what, std::max(std::abs(r.low), std::abs(r.high)), unit, low ? r.low_when : r.high_when);
    };
    set(".voltage.highest", highest_[2 * p], "V");
    set(".current.highest", highest_[2 * p + 1], "A");
  }
  if (const int rail = quantities_->index("rail"); rail >= 0 && !highest_.empty()) {
    figures.set("rail.highest", highest_[rail].high, "V", highest_[rail].high_when);
  }
  if (result_.section.driven) {
    result_.outcome = fmt::format("driven at {}", print_quantity(1 / result_.section.period, "Hz", 6));
  } else if (result_.oscillates) {
    result_.outcome = fmt::format("starts, and oscillates at {}", print_quantity(figures.value("frequency"), "Hz", 6));
    const double mean = figures.value("rail.mean");
    for (const auto& [time, rail] : result_.returns) {
      if (rail < 0.9 * mean || !(mean > 0)) continue;
      figures.set("start.time", time, "s");
      break;
    }
  } else if (result_.report.usable()) {
    result_.outcome = result_.returns.size() > 8 ? fmt::format("stops oscillating after {}: {}", print_quantity(result_.returns.back().first, "s"), standing_words())
                                                 : fmt::format("does not oscillate: {}", standing_words());
  } else {
    result_.outcome = "ended early: " + result_.report.sentence;
  }
  if (result_.window_periods > 0) {
    // Slow drift still going on in the window, period to period, is not visible in one window: compare its halves' rails.
    const auto& r = result_.returns;
    if (r.size() > 40 && figures.value("rail.mean") != 0) {
      const double change = (r.back().second - r[r.size() - 21].second) / figures.value("rail.mean");
      figures.set("window.drift", std::abs(change), "1");
      if (std::abs(change) > 1e-3) result_.notes.push_back(fmt::format("the rail still moves by {:.2g} % over the window: not settled yet", 100 * std::abs(change)));
    }
  }
  result_.verdicts = judge(design_, circuit_->sheet(), figures);
  result_.sheet = circuit_->sheet();
}

StartResult StartRun::run() {
  plan();
  bool good = true;
  double time = 0;
  for (std::size_t s = 0; good && s < stage_ends_.size(); ++s) {
    begin_stage(time, s == 0);
    const bool last = s + 1 == stage_ends_.size();
    good = last ? window() : leg(stage_ends_[s], -1);
    if (!last) fold_moments();
    time = stage_ends_[s];
  }
  if (!good) fold_moments();
  summarise();
  if (options_.on_end) options_.on_end(result_);
  return std::move(result_);
}

}  // namespace

Roles roles_of(const Design& design, const Sheet& sheet) {
  Roles roles;
  for (std::size_t n = 1; n < sheet.nodes.size(); ++n) {
    if (sheet.nodes[n] == design.rail) roles.rail = static_cast<Node>(n);
  }
  for (int p = 0; p < static_cast<int>(sheet.parts.size()); ++p) {
    const auto& part = sheet.parts[p];
    if (part.name == design.regulator) roles.regulator = p;
    if (design.load.empty() ? part.role == Role::load : part.name == design.load) roles.loads.push_back(p);
    const bool named = std::find(design.supplies.begin(), design.supplies.end(), part.name) != design.supplies.end();
    if (design.supplies.empty() ? part.role == Role::source : named) roles.supplies.push_back(p);
  }
  return roles;
}

StartResult run_start(const Design& design, StartOptions options) { return StartRun(design, std::move(options)).run(); }

}  // namespace couplet
