// SPDX-License-Identifier: MIT
// Where the energy went: from the integrals of the products of states, each part's share, and how well the ledger
// closes: energy from the sources = dissipated in each part + delivered to the loads + change of stored energy.
// Tellegen's theorem makes the sum over all elements zero only if every law and every stamp is right, so the residual
// is a check of the model and the march, not an identity of the bookkeeping.
#pragma once

#include <string>
#include <vector>

#include "engine/circuit/circuit.h"

namespace couplet {

struct EnergyAccount {
  struct Row {
    double absorbed = 0;  // through the part's terminals less what its capacitors and coils store, J
    double generated = 0; // by its electromotive forces, J
    double loss() const { return absorbed + generated; }
  };
  std::vector<Row> parts;  // by index of Sheet::parts
  double supplied = 0;     // by parts of role source: generated less nothing, J
  double dissipated = 0;   // in all parts but loads, J
  double to_loads = 0;     // J, whatever the load does with it (a battery stores it)
  double stored_change = 0;
  double scheduled = 0;    // put in by scheduled changes of values (a gap that opens does work), J
  double residual = 0;     // supplied + scheduled - dissipated - to_loads - stored_change, J
  /// |residual| over the energy supplied (or, where none is, over the largest of the terms).
  double relative() const;
  void add(const EnergyAccount& other);
};

/// Energy stored in capacitors and coils for outputs w, J (from the parts' own values, not from the state's norm).
double stored_energy(const Circuit& circuit, const Eigen::VectorXd& w);

/// `integrals[id]` is the integral of x x' spent in topology id (may be empty). The residual is filled in.
EnergyAccount account(const Circuit& circuit, const std::vector<Eigen::MatrixXd>& integrals, double stored_before, double stored_after);

}  // namespace couplet
