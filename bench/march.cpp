// SPDX-License-Identifier: MIT
// Marches each shipped design with both marches in one run and prints time, steps and events a period, topologies, the
// ratio to IDA, and the error of each against the exact march with every step 64 times finer.
#include <fmt/format.h>

#include <cstring>
#include <memory>

#include "engine/march/exact.h"
#include "engine/netlist/netlist.h"
#include "engine/study/steady_state.h"

using namespace couplet;

namespace {

struct Timing {
  double seconds = 0;
  MarchReport report;
  Eigen::VectorXd end;
};

Timing time_march(const Sheet& sheet, bool ida, double relative, double ceiling, double duration) {
  const Circuit circuit(sheet);
  MarchSettings settings;
  settings.relative = relative;
  settings.step_ceiling = ceiling;
  const auto march = ida ? ida_march(circuit, settings) : exact_march(circuit, settings);
  MarchState state = march->stand(circuit.start_state(), 0);
  Timing t;
  t.report = march->run(state, duration, nullptr);
  t.seconds = t.report.seconds;
  t.end = circuit.topology(state.cells).C * state.x;
  return t;
}

}  // namespace

int main(int argc, char** argv) {
  const bool quick = argc > 1 && std::strcmp(argv[1], "--quick") == 0;
  const double long_run = quick ? 1e-3 : 10e-3, short_run = quick ? 0.1e-3 : 0.3e-3;
  fmt::print("{:<6} {:>9} {:>12} {:>11} {:>8} {:>8} {:>6} {:>10} {:>12} {:>12}\n", "design", "march", "us a period", "real time", "steps", "events", "topol", "IDA ratio", "error", "IDA error");
  for (const char* name : {"dock", "crib", "buoy"}) {
    const Design design = read_netlist(std::string(COUPLET_SOURCE) + "/netlists/" + name + ".toml");
    const Sheet sheet = build_sheet(design);
    const SteadyState settled = run_settle(design);
    const double period = settled.orbit.period, periods = long_run / period;
    const double none = std::numeric_limits<double>::infinity();
    const Timing exact = time_march(sheet, false, 0, none, long_run);
    const Timing exact_short = time_march(sheet, false, 0, none, short_run), finer = time_march(sheet, false, 0, period / 4096, short_run);
    const double size = finer.end.cwiseAbs().maxCoeff();
    const auto error = [&](const Timing& t) { return (t.end - finer.end).cwiseAbs().maxCoeff() / size; };
    fmt::print("{:<6} {:>9} {:>12.1f} {:>11.3f} {:>8.0f} {:>8.1f} {:>6} {:>10} {:>12.1e}\n", name, "exact", 1e6 * exact.seconds / periods, long_run / exact.seconds, exact.report.steps / periods,
               (exact.report.events + exact.report.commands) / periods, exact.report.topologies, "1", error(exact_short));
    for (double relative : {1e-6, 1e-9}) {
      const Timing ida = time_march(sheet, true, relative, none, short_run);
      const double per_period = ida.seconds / (short_run / period), ratio = per_period / (exact.seconds / periods);
      fmt::print("{:<6} {:>9} {:>12.1f} {:>11.5f} {:>8.0f} {:>8.1f} {:>6} {:>10.1f} {:>12} {:>12.1e}\n", name, fmt::format("ida {:.0e}", relative), 1e6 * per_period, short_run / ida.seconds,
                 ida.report.steps / (short_run / period), ida.report.events / (short_run / period), ida.report.topologies, ratio, "", error(ida));
    }
  }
  return 0;
}
