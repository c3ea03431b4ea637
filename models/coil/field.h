// SPDX-License-Identifier: MIT
// Magnetic flux density around the coils against the reference levels of ICNIRP, Guidelines for limiting
// exposure to time-varying electric and magnetic fields (1 Hz to 100 kHz), Health Physics 99 (2010) 818. An
// estimate for planning, and no compliance test: see field_caution().
#pragma once

#include <complex>
#include <string>
#include <vector>

#include "models/coil/plane.h"

namespace couplet::coil {

enum class Exposure { general_public, occupational };

/// Reference level, T rms, at 1 Hz to 10 MHz: 27 uT for the public and 100 uT at work from 3 kHz up (seen in
/// a published reproduction of the table); below 3 kHz from memory. Throws std::invalid_argument outside.
double reference_level(double frequency, Exposure exposure);

/// Currents of one frequency in both coils, A rms, as phasors of one time origin.
struct CurrentLine {
  double frequency = 0;
  std::complex<double> first, second;
};

/// The two coils and what stands behind them, in the first coil's frame.
struct Scene {
  Coil first, second;
  Pose second_in_first;
  Surroundings surroundings;
};

struct FieldAt {
  Point at = Point::Zero();  // m
  double flux_density = 0;   // T rms, all frequencies together
  double public_share = 0;   // sum over the frequencies of B over the reference level; 1 is at the level
  double occupational_share = 0;
};

/// Field at each point. Sheets are counted by their images on the coils' side of them; behind a sheet the
/// field is that of the bare coils, which is more than what gets through.
std::vector<FieldAt> field_at(const Scene& scene, const std::vector<CurrentLine>& currents,
                              const std::vector<Point>& points);

/// The point of the largest public share at this distance from the coppers: on the cylinder around both
/// coils, its wall, top and bottom moved outward by `distance`.
FieldAt largest_field(const Scene& scene, const std::vector<CurrentLine>& currents, double distance);

/// What must be said wherever these figures are shown.
std::string field_caution();

}  // namespace couplet::coil
