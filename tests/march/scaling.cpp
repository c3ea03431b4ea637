// SPDX-License-Identifier: MIT
// Powers of two pass through floating point without rounding, so a march must not notice a change of the
// units of time and of voltage and current by them. A hidden absolute constant (a smallest step, a threshold
// in volts) shows here.
#include "engine/march/march.h"
#include "engine/netlist/netlist.h"
#include "tests/agrees.h"

namespace couplet {
namespace {

const double time_factor = std::ldexp(1.0, 20), size_factor = std::ldexp(1.0, 10);

/// Inductances, capacitances and times by the first factor, voltages and currents by the second; resistances
/// stay.
Sheet scaled(Sheet sheet) {
  for (auto& c : sheet.capacitors) c.capacitance *= time_factor, c.start *= size_factor;
  for (auto& c : sheet.coils) c.inductance *= time_factor, c.start *= size_factor;
  for (auto& m : sheet.couplings) m.mutual *= time_factor;
  for (auto& e : sheet.emfs) e.value.constant *= size_factor;
  for (auto& p : sheet.probes) p.form.constant *= size_factor;
  for (auto& b : sheet.branches) {
    b.emf.constant *= size_factor;
    for (auto& c : b.cells) c.current.constant *= size_factor;
    for (auto& c : b.conditions) c.form.constant *= size_factor, c.held.constant *= size_factor;
  }
  for (auto& w : sheet.waveforms) {
    for (auto& p : w.points) p.time *= time_factor, p.value *= size_factor;
    w.period *= time_factor, w.frequency /= time_factor, w.offset *= size_factor, w.amplitude *= size_factor;
  }
  for (auto& c : sheet.commands) c.frequency /= time_factor, c.dead *= time_factor;
  return sheet;
}

struct Outcome {
  MarchReport report;
  Eigen::VectorXd outputs;
};

Outcome march_for(const Sheet& sheet, double duration) {
  const Circuit circuit(sheet);
  const auto march = exact_march(circuit, {});
  MarchState state = march->stand(circuit.start_state(), 0);
  Outcome outcome;
  outcome.report = march->run(state, duration, nullptr);
  outcome.outputs = circuit.topology(state.cells).C * state.x;
  return outcome;
}

}  // namespace

TEST_CASE("units of time, voltage and current changed by powers of two change no bit of the dock's start") {
  const Sheet sheet = build_sheet(read_netlist(COUPLET_SOURCE "/netlists/dock.toml"));
  const double duration = 0.3e-3;
  const Outcome plain = march_for(sheet, duration), other = march_for(scaled(sheet), duration * time_factor);
  REQUIRE(plain.report.reason == MarchReport::Reason::end_time);
  REQUIRE(other.report.reason == MarchReport::Reason::end_time);
  CHECK(plain.report.events > 100);  // it oscillates: otherwise nothing would be compared
  CHECK(other.report.events == plain.report.events);
  CHECK(other.report.steps == plain.report.steps);
  for (int i = 0; i < plain.outputs.size(); ++i) {
    INFO("output " << i);
    CHECK(other.outputs[i] / size_factor == plain.outputs[i]);
  }
}

}  // namespace couplet
