// SPDX-License-Identifier: MIT
#include "engine/figures/energy.h"

#include <algorithm>
#include <cmath>

namespace couplet {

double EnergyAccount::relative() const {
  double scale = std::abs(supplied);
  if (scale == 0) scale = std::max({std::abs(scheduled), std::abs(dissipated), std::abs(to_loads), std::abs(stored_change)});
  return scale > 0 ? std::abs(residual) / scale : 0;
}

void EnergyAccount::add(const EnergyAccount& other) {
  if (parts.empty()) parts.resize(other.parts.size());
  for (std::size_t p = 0; p < parts.size() && p < other.parts.size(); ++p) {
    parts[p].absorbed += other.parts[p].absorbed;
    parts[p].generated += other.parts[p].generated;
  }
  supplied += other.supplied;
  dissipated += other.dissipated;
  to_loads += other.to_loads;
  stored_change += other.stored_change;
  scheduled += other.scheduled;
  residual += other.residual;
}

double stored_energy(const Circuit& circuit, const Eigen::VectorXd& w) {
  const Sheet& sheet = circuit.sheet();
  const auto at = [&](Node n) { return n > 0 ? w[circuit.row_of_node(n)] : 0.0; };
  double energy = 0;
  for (const auto& c : sheet.capacitors) energy += 0.5 * c.capacitance * std::pow(at(c.from) - at(c.to), 2);
  for (int c = 0; c < static_cast<int>(sheet.coils.size()); ++c) energy += 0.5 * sheet.coils[c].inductance * std::pow(w[circuit.row_of_coil(c)], 2);
  for (const auto& m : sheet.couplings) energy += m.mutual * w[circuit.row_of_coil(m.first)] * w[circuit.row_of_coil(m.second)];
  return energy;
}

EnergyAccount account(const Circuit& circuit, const std::vector<Eigen::MatrixXd>& integrals, double before, double after) {
  const Sheet& sheet = circuit.sheet();
  EnergyAccount result;
  result.parts.resize(sheet.parts.size());
  for (std::size_t id = 0; id < integrals.size(); ++id) {
    const Eigen::MatrixXd& W = integrals[id];
    if (W.size() == 0) continue;
    const Topology& topology = circuit.topology_by_id(static_cast<int>(id));
    const auto voltage = [&](Node plus, Node minus) { return circuit.row_over_state(topology, Form().volt(plus, minus)); };
    const auto integral = [&](const Eigen::RowVectorXd& a, const Eigen::RowVectorXd& b) { return (a * W).dot(b); };
    for (std::size_t b = 0; b < sheet.branches.size(); ++b) {
      const Branch& branch = sheet.branches[b];
      const Eigen::RowVectorXd current = circuit.row_over_state(topology, branch.cells[topology.cells[b]].current);
      auto& row = result.parts[branch.part];
      row.absorbed += integral(voltage(branch.from, branch.to), current);
      if (branch.has_emf) {
        row.generated -= integral(circuit.row_over_state(topology, branch.emf), current);
      } else if (sheet.parts[branch.part].role == Role::source && branch.cells.size() == 1 && branch.cells[0].current.volts.empty()) {
        row.generated -= integral(voltage(branch.from, branch.to), current);  // a pure current source
      }
    }
    for (std::size_t e = 0; e < sheet.emfs.size(); ++e) {
      const Emf& emf = sheet.emfs[e];
      const Eigen::RowVectorXd current = topology.C.row(circuit.row_of_emf(static_cast<int>(e)));
      const double power = integral(voltage(emf.from, emf.to), current);
      result.parts[emf.part].absorbed += power;
      result.parts[emf.part].generated -= power;
    }
    for (std::size_t t = 0; t < sheet.transformers.size(); ++t) {
      const Transformer& s = sheet.transformers[t];
      const Eigen::RowVectorXd current = topology.C.row(circuit.row_of_transformer(static_cast<int>(t)));
      result.parts[s.part].absorbed += integral(voltage(s.a, s.b), current) - s.ratio * integral(voltage(s.c, s.d), current);
    }
    for (std::size_t c = 0; c < sheet.coils.size(); ++c) {
      const Eigen::RowVectorXd current = topology.C.row(circuit.row_of_coil(static_cast<int>(c)));
      result.parts[sheet.coils[c].part].absorbed += sheet.coils[c].resistance * integral(current, current);
    }
  }
  result.stored_change = after - before;
  for (std::size_t p = 0; p < sheet.parts.size(); ++p) {
    const auto& row = result.parts[p];
    if (sheet.parts[p].role == Role::load) {
      result.to_loads += row.absorbed;
    } else {
      result.dissipated += row.loss();
      result.supplied += row.generated;
    }
  }
  result.residual = result.supplied + result.scheduled - result.dissipated - result.to_loads - result.stored_change;
  return result;
}

}  // namespace couplet
