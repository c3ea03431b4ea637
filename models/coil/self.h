// SPDX-License-Identifier: MIT
// Self inductance of a winding, in free space, with the current spread evenly over the conductor (low
// frequency).
#pragma once

#include "models/coil/mutual.h"

namespace couplet::coil {

/// Geometric mean radius of the conductor about itself, m: a e^(-1/4) for round ones, 0.2235 (width +
/// thickness) for a trace (F. W. Grover, Inductance Calculations (1946), ch. 3).
double mean_radius(const Conductor& conductor);

/// Self inductance of one turn of this conductor, H: for circles mu0 R (ln(8 R/g) - 2) with the geometric
/// mean radius g (mu0 R (ln(8 R/a) - 7/4) for round wire); for rectangles Neumann's integral at the distance
/// g.
double turn_inductance(const Filament& turn, const Conductor& conductor);

/// Self inductance, H: turns and all their mutual inductances; between wide traces the geometric mean
/// distance takes the place of that of the centres.
Integral self_inductance(const Coil& coil, double tolerance = 1e-9);

}  // namespace couplet::coil
