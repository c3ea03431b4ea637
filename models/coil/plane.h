// SPDX-License-Identifier: MIT
// A ferrite sheet or a conducting plate behind a coil, by the method of images (J. C. Maxwell 1873, art. 655
// for the conductor; P. Hammond, Proc. IEE 107C (1960) 306, from memory, for the permeable half-space). The
// sheet is taken as an endless half-space: a current then sees its mirror image, times (mu - 1)/(mu + 1) for
// a relative permeability mu and times -1 for a perfect conductor.
//
// Two sheets give an endless series of images of images. It is summed lap by lap (one reflection in each
// sheet) until what is left is below the tolerance; what is left is estimated from the dipole law
// 1/distance^3, added, and a share of it stated as error. Sheets that are not parallel (a tilted coil) have
// no exact series: it is stopped where the reflected frame has turned by a right angle, and the last lap is
// stated as error.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "models/coil/mutual.h"

namespace couplet::coil {

struct Plane {
  bool conducting = false;
  double permeability =
      1;  // relative, at the working frequency and flux; may be infinite; not used where conducting
  double distance = 0;   // m, from the coil's rear copper face to the sheet
  double thickness = 0;  // m; only to judge validity; 0: not known
  double reach = 0;      // m, from the coil's axis to the nearest edge; only to judge validity; 0: not known

  double factor() const;  // of the image current
};

struct Surroundings {
  std::optional<Plane> behind_first;   // below the first coil, parallel to it
  std::optional<Plane> behind_second;  // above the second coil, parallel to it and tilted with it
  bool empty() const { return !behind_first && !behind_second; }
};

/// One mirror image of the whole arrangement: an isometry of the first coil's frame, and the factor of its
/// currents.
struct Image {
  Pose pose;
  double factor = 0;
};

/// The images of one lap (1, 2, ...): at most two with an odd number of reflections and two with an even one;
/// none where the series has ended.
std::vector<Image> images(const Surroundings& surroundings, const Coil& first, const Coil& second,
                          const Pose& second_in_first, int lap);

struct Inductances {
  Integral first, second, mutual;  // H, turns multiplied in
  int laps = 0;                    // of images that were summed
};

/// Self inductances in free space, for those who place the same two coils many times.
struct Alone {
  Integral first, second;
};

/// Both self inductances and the mutual one. Throws std::invalid_argument where a coil cuts through a sheet.
Inductances inductances(const Coil& first, const Coil& second, const Pose& second_in_first,
                        const Surroundings& surroundings, double tolerance = 1e-8,
                        const std::optional<Alone>& alone = {});

/// Self inductance of one coil with at most one sheet behind it.
Integral self_inductance(const Coil& coil, const std::optional<Plane>& behind, double tolerance = 1e-8);

/// Sentences that say how far the images can be trusted here; empty without sheets.
std::vector<std::string> validity(const Surroundings& surroundings, const Coil& first, const Coil& second,
                                  double tilt);

}  // namespace couplet::coil
