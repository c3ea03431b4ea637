// SPDX-License-Identifier: MIT
// Settling against marching, in one run: cold from the netlist, warm from a neighbour, and the exact march to within
// 1e-6 of the same state; for the shipped filter and one twenty times larger.
#include <fmt/format.h>

#include <chrono>
#include <cmath>
#include <cstring>

#include "engine/study/steady_state.h"

using namespace couplet;

namespace {
double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }
}  // namespace

int main(int argc, char** argv) {
  const bool quick = argc > 1 && std::strcmp(argv[1], "--quick") == 0;
  fmt::print("{:<6} {:>10} {:>10} {:>10} {:>12} {:>12} {:>12} {:>12} {:>14}\n", "design", "filter", "cold ms", "warm ms", "warm a second", "march ms", "march laps", "march/cold", "march/warm");
  for (const char* name : {"dock", "crib", "buoy"}) {
    for (double factor : {1.0, 20.0}) {
      Design design = read_netlist(std::string(COUPLET_SOURCE) + "/netlists/" + name + ".toml");
      const double filter = design.get("filter.capacitance").value * factor;
      design.set("filter.capacitance", filter);
      const Section section = section_of(design);
      double begun = now();
      const SteadyState cold = run_settle(design, &section);
      const double cold_seconds = cold.orbit.seconds;
      // Warm: 20 neighbours along the supply, each from the one before, circuits built anew.
      const int neighbours = quick ? 3 : 20;
      const std::string along = "supply";
      const double first = design.get(along).value;
      MarchState state = cold.orbit.start;
      double period = cold.orbit.period;
      begun = now();
      int found = 0;
      for (int k = 1; k <= neighbours; ++k) {
        design.set(along, first * (1 + 0.002 * k));
        Bench bench(design, section, {});
        SettleOptions options;
        options.guess_only = true;
        const Orbit orbit = settle(bench.lapper, options, &state, period);
        found += orbit.found();
        if (orbit.found()) state = orbit.start, period = orbit.period;
      }
      const double warm_seconds = (now() - begun) / neighbours;
      design.set(along, first);
      // March from rest until the state on the section is within 1e-6 of the orbit's.
      Bench bench(design, section, {});
      const int n = bench.circuit.states();
      MarchState at = bench.lapper.march().stand(bench.circuit.start_state(), 0);
      begun = now();
      if (bench.lapper.base() > 0) bench.lapper.march().run(at, bench.lapper.base(), nullptr);
      long laps = 0;
      const Eigen::VectorXd goal = cold.orbit.start.x.head(n);
      for (; laps < (quick ? 500 : 200000); ++laps) {
        const Lap lap = bench.lapper.lap(at, cold.orbit.period, 1, false);
        if (!lap.returned) break;
        at = lap.end;
        if ((at.x.head(n) - goal).norm() < 1e-6 * goal.norm()) break;
      }
      const double march_seconds = now() - begun;
      fmt::print("{:<6} {:>10} {:>10.2f} {:>10.2f} {:>12.0f} {:>12.1f} {:>12} {:>12.1f} {:>14.1f}{}\n", name, fmt::format("{:.0f} uF", filter * 1e6), 1e3 * cold_seconds, 1e3 * warm_seconds,
                 1 / warm_seconds, 1e3 * march_seconds, laps, march_seconds / cold_seconds, march_seconds / warm_seconds, found == neighbours ? "" : fmt::format("  ({} of {} warm found)", found, neighbours));
    }
  }
  return 0;
}
