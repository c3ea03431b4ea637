// SPDX-License-Identifier: MIT
#include "engine/figures/steady.h"

#include <algorithm>
#include <cmath>

namespace couplet {

Figures window_figures(const Quantities& quantities, const Extremes& extremes, const WindowData& window) {
  const Circuit& circuit = quantities.circuit();
  const Sheet& sheet = circuit.sheet();
  const Roles& roles = quantities.roles();
  const int count = static_cast<int>(quantities.all().size());
  // Means and mean squares of every quantity.
  Eigen::VectorXd means = Eigen::VectorXd::Zero(count), squares = Eigen::VectorXd::Zero(count);
  for (std::size_t id = 0; id < window.integrals.size(); ++id) {
    const Eigen::MatrixXd& W = window.integrals[id];
    if (W.size() == 0) continue;
    const Eigen::MatrixXd rows = quantities.rows(circuit.topology_by_id(static_cast<int>(id)));
    means += rows * W.col(circuit.states());
    squares += (rows * W).cwiseProduct(rows).rowwise().sum();
  }
  means /= window.duration;
  squares /= window.duration;

  Figures figures;
  const double duration = window.duration;
  if (window.periods > 0) {
    figures.set("frequency", window.periods / duration, "Hz");
    figures.set("period", duration / window.periods, "s");
  }
  const EnergyAccount energy = account(circuit, window.integrals, window.stored_before, window.stored_after);
  double supply = 0, load = 0;
  for (int p : roles.supplies) supply -= energy.parts[p].absorbed / duration;
  for (int p : roles.loads) load += energy.parts[p].absorbed / duration;
  if (!roles.supplies.empty()) figures.set("supply.power", supply, "W");
  if (!roles.loads.empty()) figures.set("load.power", load, "W");
  if (!roles.supplies.empty() && !roles.loads.empty()) figures.set("efficiency", supply != 0 ? load / supply : 0, "1");
  const auto range = [&](const std::string& name) { return extremes.ranges()[quantities.index(name)]; };
  if (roles.rail >= 0) {
    const auto r = range("rail");
    figures.set("rail.mean", means[quantities.index("rail")], "V");
    figures.set("rail.min", r.low, "V", r.low_when);
    figures.set("rail.max", r.high, "V", r.high_when);
    figures.set("rail.ripple", r.high - r.low, "V");
  }
  if (roles.regulator >= 0) {
    const auto r = range("regulator.headroom");
    figures.set("regulator.headroom", r.low, "V", r.low_when);
    figures.set("regulator.output.mean", means[quantities.index("regulator.output")], "V");
  }
  figures.set("ledger.residual", energy.relative(), "1");
  figures.set("stored.change", energy.stored_change, "J");
  for (int p = 0; p < static_cast<int>(sheet.parts.size()); ++p) {
    const std::string& name = sheet.parts[p].name;
    const auto& voltage = extremes.ranges()[2 * p];
    const auto& current = extremes.ranges()[2 * p + 1];
    const auto largest = [](const Extremes::Range& r) {
      return std::abs(r.low) > std::abs(r.high) ? std::pair{std::abs(r.low), r.low_when} : std::pair{std::abs(r.high), r.high_when};
    };
    figures.set(name + ".loss", energy.parts[p].loss() / duration, "W");
    const auto [v, when_v] = largest(voltage);
    const auto [i, when_i] = largest(current);
    figures.set(name + ".voltage.peak", v, "V", when_v);
    figures.set(name + ".current.peak", i, "A", when_i);
    figures.set(name + ".current.rms", std::sqrt(std::max(squares[2 * p + 1], 0.0)), "A");
    figures.set(name + ".current.mean", means[2 * p + 1], "A");
  }
  return figures;
}

}  // namespace couplet
