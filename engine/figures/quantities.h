// SPDX-License-Identifier: MIT
// What is watched of a circuit: voltage and current of each part, the rail, the regulator's headroom; each a row over the
// state, topology by topology.
#pragma once

#include <string>
#include <vector>

#include "engine/circuit/circuit.h"

namespace couplet {

/// Which node is the rail, which part the load, the regulator, the supplies (indices into Sheet::parts; -1: none).
struct Roles {
  Node rail = -1;
  std::vector<int> loads, supplies;
  int regulator = -1;
};

struct Watched {
  enum class Kind { part_voltage, part_current, rail, headroom, regulator_output };
  Kind kind;
  int part = -1;
  std::string name;  // "left_switch.voltage"
  std::string unit;
};

class Quantities {
 public:
  Quantities(const Circuit& circuit, const Roles& roles);
  const std::vector<Watched>& all() const { return all_; }
  int index(const std::string& name) const;  // -1: none
  /// Rows over x of all quantities in a topology. A capacitor's share of a part's current is C dv/dt.
  Eigen::MatrixXd rows(const Topology& topology) const;
  const Circuit& circuit() const { return circuit_; }
  const Roles& roles() const { return roles_; }

 private:
  Eigen::RowVectorXd voltage_row(const Topology& topology, Node plus, Node minus) const;
  Eigen::RowVectorXd current_row(const Topology& topology, int part) const;

  const Circuit& circuit_;
  Roles roles_;
  std::vector<Watched> all_;
};

}  // namespace couplet
