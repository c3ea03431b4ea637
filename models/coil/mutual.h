// SPDX-License-Identifier: MIT
// Mutual inductance, in free space.
#pragma once

#include "models/coil/winding.h"

namespace couplet::coil {

/// How a value was reached: the estimated error is absolute, in the value's unit.
struct Integral {
  double value = 0;
  double error = 0;
};

/// Mutual inductance of two filaments, H per turn and turn: the vector potential of the first integrated
/// along the second (F. E. Neumann 1845, with one of the two integrals in closed form). Coaxial circles by
/// Maxwell's expression. `tolerance` is relative to the integral of |A . dl|, which is what matters where the
/// value itself passes zero.
Integral mutual(const Filament& first, const Filament& second, const Pose& second_in_first,
                double tolerance = 1e-10);

/// Mutual inductance of two windings, H, turns multiplied in.
Integral mutual(const Coil& first, const Coil& second, const Pose& second_in_first, double tolerance = 1e-9);

}  // namespace couplet::coil
