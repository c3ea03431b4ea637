// SPDX-License-Identifier: MIT
#include "models/coil/placement.h"

#include <algorithm>
#include <cmath>
#include <cstdio>

namespace couplet::coil {

Pose pose(const Coil& first, const Coil& second, const Placement& p) {
  Pose made;
  const double c = std::cos(p.tilt), s = std::sin(p.tilt);
  made.turn << c, 0, s, 0, 1, 0, -s, 0, c;
  made.shift = Point(p.shift, p.shift_across, p.gap + (first.height + second.height) / 2);
  return made;
}

std::string collision(const Coil& first, const Coil& second, const Pose& second_in_first) {
  // Half the conductors' extents along their thinner side: closer centre lines cannot be built whatever the
  // direction.
  const double room = 0.5 * (std::min(first.across, first.along) + std::min(second.across, second.along));
  double nearest = 1e300;
  for (const Filament& f : second.filaments) {
    for (const Piece& piece : pieces(f)) {
      const int samples = piece.straight ? 9 : 12;
      for (int i = 0; i < samples; ++i) {
        Point position, direction;
        piece.at((i + 0.5) / samples, position, direction);
        const Point seen = second_in_first(position);
        for (const Filament& other : first.filaments) nearest = std::min(nearest, distance(other, seen));
      }
    }
  }
  if (nearest >= room * (1 - 1e-6)) return {};
  char text[160];
  std::snprintf(text, sizeof text,
                "the windings would touch (centre lines %.3g mm apart); enlarge the gap or lessen the tilt",
                nearest * 1e3);
  return text;
}

}  // namespace couplet::coil
