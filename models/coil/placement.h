// SPDX-License-Identifier: MIT
// Where the second coil stands against the first.
#pragma once

#include <string>

#include "models/coil/winding.h"

namespace couplet::coil {

/// At rest the second coil stands over the first, both axes up, both wound the same way round.
struct Placement {
  double gap =
      0;  // m, between the facing copper faces while the coils are parallel; negative: one inside the other
  double shift = 0;         // m, sideways, along x (the length of a rectangular coil)
  double shift_across = 0;  // m, sideways, along y
  double tilt = 0;          // rad, of the second coil about its centre, around y
};

/// Maps the second coil's frame into the first's.
Pose pose(const Coil& first, const Coil& second, const Placement& placement);

/// Empty, or a sentence that says where the two coppers would touch, and what to do.
std::string collision(const Coil& first, const Coil& second, const Pose& second_in_first);

}  // namespace couplet::coil
