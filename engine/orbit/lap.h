// SPDX-License-Identifier: MIT
// One lap: from a state on the section to the next return, with the derivative of the end state by the start state (the
// monodromy matrix over that time).
//
// The matrix is the product of the spans' exponentials. Where a law jumps at an event (hysteresis; an ideal comparator),
// the field jumps with it, and the product takes the factor I + (f+ - f-) c / (c f-) there, c the guard's row (the
// saltation matrix; see e.g. M. di Bernardo et al., Piecewise-smooth Dynamical Systems, Springer 2008, ch. 2). Continuous laws
// make that factor the identity.
#pragma once

#include "engine/march/exact.h"
#include "engine/orbit/section.h"

namespace couplet {

struct Lap {
  bool returned = false;
  MarchState end;
  double duration = 0;        // s
  std::string trouble;        // where it did not return
  Eigen::MatrixXd monodromy;  // states square; empty unless asked for
};

class Lapper {
 public:
  /// `circuit` holds the section as its probe 0 where the section is free.
  Lapper(const Circuit& circuit, const Section& section, const MarchSettings& settings);

  /// From `from` (time is reset to base() first) over `returns` returns; each is the first rising crossing later than 0.6
  /// of `period` after the one before (driven: exactly the period). A free lap gives up after 20 periods.
  Lap lap(const MarchState& from, double period, int returns, bool with_monodromy, Observer* also = nullptr);
  /// Decides cells for changed energy coordinates; false where none fit.
  bool seat(MarchState& state, const Eigen::VectorXd& xi, std::string& trouble);
  /// The section's row over xi, its value, and the field (d xi/dt) at a state.
  Eigen::VectorXd section_row(const MarchState& state) const;
  double section_value(const MarchState& state) const;
  Eigen::VectorXd field(const MarchState& state) const;
  /// A time after the last corner that does not repeat, in phase with the drive.
  double base() const { return base_; }
  ExactMarch& march() { return march_; }
  const Circuit& circuit() const { return circuit_; }
  const Section& section() const { return section_; }
  long laps = 0;

 private:
  const Circuit& circuit_;
  Section section_;
  ExactMarch march_;
  double base_ = 0;
};

}  // namespace couplet
