// SPDX-License-Identifier: MIT
// Two coils from a drawing to the values of a circuit, in one call.
#pragma once

#include <string>
#include <vector>

#include "models/coil/placement.h"
#include "models/coil/plane.h"
#include "models/coil/resistance.h"
#include "models/coil/table.h"

namespace couplet::coil {

struct LinkGeometry {
  Winding first, second;
  Placement place;
  Surroundings sheets;
};

struct LinkValues {
  double first = 0, second = 0;                              // L1, L2 at the frequency asked, H
  double mutual = 0, coupling = 0;                           // M, H; k = M/sqrt(L1 L2)
  double first_resistance = 0, second_resistance = 0;        // at the frequency asked, ohm
  double first_resistance_dc = 0, second_resistance_dc = 0;  // ohm
  double error = 0;                // of the inductances' quadrature, relative to sqrt(L1 L2)
  std::vector<std::string> notes;  // what the values leave out

  PairValues pair() const { return {first, second, mutual, first_resistance, second_resistance}; }
};

/// A link whose windings are built once and then placed as often as wanted.
class Link {
 public:
  /// Throws std::invalid_argument with all problems of both windings, each line beginning with "first" or
  /// "second".
  Link(const Winding& first, const Winding& second, const Surroundings& sheets);

  /// Values at a frequency (0: dc) and a copper temperature. Throws std::invalid_argument where the coppers
  /// would touch or a coil cuts a sheet.
  LinkValues at(const Placement& place, double frequency, double celsius = 20, double tolerance = 1e-7) const;

  const Coil& first() const { return first_; }
  const Coil& second() const { return second_; }

 private:
  Coil first_, second_;
  Surroundings sheets_;
  Alone alone_;
  Resistance first_alone_, second_alone_;  // each in the field of its own winding and its own sheet
};

/// Best efficiency from coil to coil, at the load that suits it: x/(1 + sqrt(1 + x))^2 with x = k^2 Q1 Q2 (K.
/// van Schuylenbergh, R. Puers, Inductive Powering (2009); M. Zargham, P. G. Gulak 2012).
double best_efficiency(double coupling, double first_quality, double second_quality);

LinkValues link_values(const LinkGeometry& geometry, double frequency, double celsius = 20);

/// One row for each gap, shift and tilt, ready for a PositionTable. Throws as Link does, with the position
/// named.
std::vector<TableRow> tabulate(const LinkGeometry& geometry, const std::vector<double>& gaps,
                               const std::vector<double>& shifts, const std::vector<double>& tilts,
                               double frequency, double celsius = 20);

}  // namespace couplet::coil
