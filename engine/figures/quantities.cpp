// SPDX-License-Identifier: MIT
#include "engine/figures/quantities.h"

namespace couplet {

Quantities::Quantities(const Circuit& circuit, const Roles& roles) : circuit_(circuit), roles_(roles) {
  const auto& parts = circuit.sheet().parts;
  for (int p = 0; p < static_cast<int>(parts.size()); ++p) {
    all_.push_back({Watched::Kind::part_voltage, p, parts[p].name + ".voltage", "V"});
    all_.push_back({Watched::Kind::part_current, p, parts[p].name + ".current", "A"});
  }
  if (roles.rail >= 0) all_.push_back({Watched::Kind::rail, -1, "rail", "V"});
  if (roles.regulator >= 0) {
    all_.push_back({Watched::Kind::headroom, roles.regulator, "regulator.headroom", "V"});
    all_.push_back({Watched::Kind::regulator_output, roles.regulator, "regulator.output", "V"});
  }
}

int Quantities::index(const std::string& name) const {
  for (std::size_t i = 0; i < all_.size(); ++i) {
    if (all_[i].name == name) return static_cast<int>(i);
  }
  return -1;
}

Eigen::RowVectorXd Quantities::voltage_row(const Topology& topology, Node plus, Node minus) const {
  Eigen::RowVectorXd row = Eigen::RowVectorXd::Zero(circuit_.size());
  if (plus > 0) row += topology.C.row(circuit_.row_of_node(plus));
  if (minus > 0) row -= topology.C.row(circuit_.row_of_node(minus));
  return row;
}

Eigen::RowVectorXd Quantities::current_row(const Topology& topology, int part) const {
  const Sheet& sheet = circuit_.sheet();
  const Node plus = sheet.parts[part].plus;
  Eigen::RowVectorXd row = Eigen::RowVectorXd::Zero(circuit_.size());
  const auto add = [&](const auto& element, const Eigen::RowVectorXd& current) {
    if (element.from == plus) row += current;
    if (element.to == plus) row -= current;
  };
  for (std::size_t b = 0; b < sheet.branches.size(); ++b) {
    if (sheet.branches[b].part == part) add(sheet.branches[b], circuit_.row_over_state(topology, sheet.branches[b].cells[topology.cells[b]].current));
  }
  for (const auto& c : sheet.capacitors) {
    if (c.part == part) add(c, c.capacitance * (voltage_row(topology, c.from, c.to) * topology.A));
  }
  for (std::size_t c = 0; c < sheet.coils.size(); ++c) {
    if (sheet.coils[c].part == part) add(sheet.coils[c], topology.C.row(circuit_.row_of_coil(static_cast<int>(c))));
  }
  for (std::size_t e = 0; e < sheet.emfs.size(); ++e) {
    if (sheet.emfs[e].part == part) add(sheet.emfs[e], topology.C.row(circuit_.row_of_emf(static_cast<int>(e))));
  }
  for (std::size_t t = 0; t < sheet.transformers.size(); ++t) {
    if (sheet.transformers[t].part != part) continue;
    const Eigen::RowVectorXd current = topology.C.row(circuit_.row_of_transformer(static_cast<int>(t)));
    if (sheet.transformers[t].a == plus) row += current;
  }
  return row;
}

Eigen::MatrixXd Quantities::rows(const Topology& topology) const {
  const auto& parts = circuit_.sheet().parts;
  Eigen::MatrixXd rows(all_.size(), circuit_.size());
  for (int i = 0; i < static_cast<int>(all_.size()); ++i) {
    const Watched& w = all_[i];
    switch (w.kind) {
      case Watched::Kind::part_voltage: rows.row(i) = voltage_row(topology, parts[w.part].plus, parts[w.part].minus); break;
      case Watched::Kind::part_current: rows.row(i) = current_row(topology, w.part); break;
      case Watched::Kind::rail: rows.row(i) = voltage_row(topology, roles_.rail, 0); break;
      case Watched::Kind::headroom:
        rows.row(i) = voltage_row(topology, parts[w.part].input, parts[w.part].output);
        rows(i, circuit_.states()) -= parts[w.part].dropout;
        break;
      case Watched::Kind::regulator_output: rows.row(i) = voltage_row(topology, parts[w.part].output, parts[w.part].common); break;
    }
  }
  return rows;
}

}  // namespace couplet
