// SPDX-License-Identifier: MIT
#include "engine/study/steady_state.h"

#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <cmath>

#include "engine/study/start.h"

namespace couplet {
namespace {

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

Sheet sheet_with_section(const Design& design, const Section& section) {
  Sheet sheet = build_sheet(design, 0);
  if (!section.driven && section.problem.empty()) sheet.probes.push_back({"section", section.form});
  return sheet;
}

class Several : public Observer {
 public:
  explicit Several(std::vector<Observer*> all) : all_(std::move(all)) {}
  void span(const Span& span) override {
    for (auto* o : all_) o->span(span);
  }
  void event(const Event& event) override {
    for (auto* o : all_) o->event(event);
  }

 private:
  std::vector<Observer*> all_;
};

void add_stability(Figures& figures, const Orbit& orbit) {
  const double largest = orbit.largest_multiplier();
  figures.set("orbit.multiplier", largest, "1");
  if (largest > 0 && largest < 1) {
    figures.set("orbit.slowest.time", -orbit.period / std::log(largest), "s");
    figures.set("orbit.slowest.periods", -orbit.returns / std::log(largest), "1");
  }
  figures.set("orbit.residual", orbit.residual, "1");
  if (std::isfinite(orbit.trivial_error)) {
    figures.set("orbit.trivial.error", orbit.trivial_error, "1");
    figures.set("orbit.field.error", orbit.field_error, "1");
  }
}

}  // namespace

Bench::Bench(const Design& design, const Section& section, const MarchSettings& settings)
    : circuit(sheet_with_section(design, section)), lapper(circuit, section, settings), quantities(circuit, roles_of(design, circuit.sheet())) {}

double patience_of(const Design& design) {
  if (design.run.duration) return *design.run.duration;
  const Circuit circuit(build_sheet(design, 0));
  return 800 * natural_period(circuit);
}

Section section_of(const Design& design) { return find_section(build_sheet(design, 0), design.run.section, patience_of(design)); }

Figures orbit_figures(Bench& bench, const Orbit& orbit, SteadyState* details) {
  Lapper& lapper = bench.lapper;
  Extremes extremes(bench.quantities);
  Timeline timeline(bench.circuit);
  std::vector<int> wanted;
  std::vector<std::string> names;
  for (int p = 0; p < static_cast<int>(bench.circuit.sheet().parts.size()); ++p) {
    const auto& part = bench.circuit.sheet().parts[p];
    if (part.kind != "coil" && part.role != Role::source) continue;
    wanted.push_back(2 * p + 1);
    names.push_back(part.name + ".current");
  }
  constexpr int orders = 15;
  Harmonics harmonics(bench.quantities, wanted, lapper.base(), orbit.period / orbit.returns, orders);
  std::vector<Observer*> observers = {&extremes, &timeline};
  if (details && orbit.returns == 1) observers.push_back(&harmonics);
  Several several(observers);
  lapper.march().settings().keep_moments = true;
  lapper.march().moments().clear();
  const double before = stored_energy(bench.circuit, bench.circuit.topology(orbit.start.cells).C * orbit.start.x);
  const Lap lap = lapper.lap(orbit.start, orbit.period / orbit.returns, orbit.returns, false, &several);
  lapper.march().settings().keep_moments = false;
  WindowData window;
  window.duration = lap.duration;
  window.periods = orbit.returns;
  window.integrals = lapper.march().moment_integrals();
  window.stored_before = before;
  window.stored_after = stored_energy(bench.circuit, bench.circuit.topology(lap.end.cells).C * lap.end.x);
  Figures figures = window_figures(bench.quantities, extremes, window);
  timeline.add_figures(figures);
  add_stability(figures, orbit);
  if (details) {
    details->timeline = timeline.stretches();
    details->ledger = account(bench.circuit, window.integrals, window.stored_before, window.stored_after);
    if (orbit.returns == 1) {
      for (std::size_t i = 0; i < wanted.size(); ++i) {
        for (int k = 1; k <= orders; ++k) details->harmonics.push_back({names[i], k, k / orbit.period, harmonics.amplitude(static_cast<int>(i), k)});
      }
    }
  }
  return figures;
}

SteadyState run_settle(const Design& design, const Section* section) {
  SteadyState result;
  result.section = section ? *section : section_of(design);
  const double patience = patience_of(design);
  if (!result.section.problem.empty() && result.section.driven) throw InputError(design.file + ": " + result.section.problem);
  result.bench = std::make_unique<Bench>(design, result.section, MarchSettings{});
  SettleOptions options;
  options.patience = patience;
  result.orbit = settle(result.bench->lapper, options);
  if (result.orbit.found()) {
    const double began = now();
    result.figures = orbit_figures(*result.bench, result.orbit, &result);
    result.seconds_figures = now() - began;
  }
  result.verdicts = judge(design, result.bench->circuit.sheet(), result.figures);
  return result;
}

}  // namespace couplet
