// SPDX-License-Identifier: MIT
// Sheets by images, against values and limits.
#include "models/coil/plane.h"

#include <limits>
#include <random>

#include "models/coil/placement.h"
#include "models/coil/self.h"
#include "tests/agrees.h"

using namespace couplet::coil;
using couplet::test::agrees;

namespace {

const double endless = std::numeric_limits<double>::infinity();

Coil ten_turns() {  // turn radii 21.5 to 10.25 mm, wire radius 0.5 mm
  Winding w;
  w.turns = 10, w.conductor.diameter = 1e-3, w.outer_diameter = 0.044, w.inner_diameter = 0.0195;
  return build(w);
}

Coil twenty_turns() {
  Winding w;
  w.turns = 20, w.conductor.diameter = 0.4e-3, w.outer_diameter = 0.0404, w.inner_diameter = 0.0196;
  return build(w);
}

Plane ferrite(double mu, double height) {
  Plane p;
  p.permeability = mu, p.distance = height - 0.5e-3;  // height of the centre lines
  return p;
}

Plane plate(double height) {
  Plane p;
  p.conducting = true, p.distance = height - 0.5e-3;
  return p;
}

}  // namespace

TEST_CASE("one sheet behind one coil", "[coil]") {
  // Computed with 20 digits from Maxwell's loops and their images; heights in mm, uH.
  const Coil coil = ten_turns();
  const couplet::test::Tolerance digits{1e-11, 0, "the reference value is given to 12 digits"};
  CHECK(agrees(self_inductance(coil, ferrite(endless, 1e-3)).value, 6.47926236405e-6, digits));
  CHECK(agrees(self_inductance(coil, ferrite(50, 1e-3)).value, 6.365724055301e-6, digits));
  CHECK(agrees(self_inductance(coil, plate(1e-3)).value, 0.6888086178501e-6, digits));
  CHECK(agrees(self_inductance(coil, ferrite(endless, 3e-3)).value, 5.446784644227e-6, digits));
  CHECK(agrees(self_inductance(coil, ferrite(50, 3e-3)).value, 5.373735657824e-6, digits));
  CHECK(agrees(self_inductance(coil, plate(3e-3)).value, 1.721286337674e-6, digits));
  // Limits: permeability 1 is air, a plane far away does nothing, one plane at most doubles the inductance.
  CHECK(self_inductance(coil, ferrite(1, 1e-3)).value == self_inductance(coil).value);
  CHECK(agrees(self_inductance(coil, ferrite(endless, 10)).value, self_inductance(coil).value,
               {1e-6, 0, "a dipole's image at 20 m"}));
  CHECK(self_inductance(coil, ferrite(endless, 0.5e-3)).value < 2 * self_inductance(coil).value);
}

TEST_CASE("two sheets: the boundary conditions hold", "[coil]") {
  // Between two parallel sheets the summed images must make the field meet the sheets at right angles
  // (infinite permeability) or along them (conductor). The series is what inductances() sums.
  const Coil first = ten_turns(), second = twenty_turns();
  const Pose p = pose(first, second, {3e-3, 4e-3, 0, 0});
  for (const bool conducting : {false, true}) {
    Surroundings around;
    around.behind_first = conducting ? plate(2e-3) : ferrite(endless, 2e-3);
    around.behind_second = around.behind_first;
    const double z = -first.height / 2 - around.behind_first->distance;
    for (const double x : {0.002, 0.012, 0.03}) {
      const Point at(x, 0.003, z);
      const auto field = [&](const Pose& image) {
        // Of a mirrored current: turned by the isometry, and once more by its handedness (B is an axial
        // vector).
        Point sum = Point::Zero();
        for (const Filament& f : first.filaments) sum += flux_density(f, image.inverse()(at));
        return Point(image.turn.determinant() * (image.turn * sum));
      };
      Point total = field({});
      for (int lap = 1; lap <= 200; ++lap)
        for (const Image& image : images(around, first, second, p, lap))
          total += image.factor * field(image.pose);
      const double wrong = conducting ? std::abs(total.z()) : std::hypot(total.x(), total.y());
      CHECK(wrong < 1e-4 * total.norm());  // what 200 laps of dipoles leave, 1/200^2 of a lap
    }
  }
}

TEST_CASE("two sheets: limits, truncation, order", "[coil]") {
  const Coil first = ten_turns(), second = twenty_turns();
  const Pose p = pose(first, second, {3e-3, 4e-3, 0, 0});
  Surroundings around;
  around.behind_first = ferrite(endless, 2e-3), around.behind_second = ferrite(endless, 2e-3);
  const Inductances strict = inductances(first, second, p, around, 1e-9),
                    loose = inductances(first, second, p, around, 1e-6);
  INFO("laps " << strict.laps << " and " << loose.laps);
  CHECK(strict.laps > loose.laps);
  for (const auto& [a, b] :
       {std::pair{strict.first, loose.first}, {strict.second, loose.second}, {strict.mutual, loose.mutual}}) {
    CHECK(std::abs(a.value - b.value) <= 2 * b.error + 1e-15);
    CHECK(b.error < 1e-4 * b.value);
  }
  // The same seen from the second coil.
  const Inductances turned =
      inductances(second, first, pose(second, first, {3e-3, 4e-3, 0, 0}), around, 1e-9);
  CHECK(agrees(turned.mutual.value, strict.mutual.value, {1e-6, 0, "both carry their truncation"}));
  CHECK(agrees(turned.first.value, strict.second.value, {1e-6, 0, "both carry their truncation"}));
  // One of the two of permeability 1: the same as a single one. Both: free space.
  around.behind_second = ferrite(1, 2e-3);
  Surroundings single;
  single.behind_first = around.behind_first;
  CHECK(agrees(inductances(first, second, p, around).mutual.value,
               inductances(first, second, p, single).mutual.value, {1e-12, 0, "identical sums"}));
  around.behind_first = ferrite(1, 2e-3);
  CHECK(agrees(inductances(first, second, p, around).mutual.value, mutual(first, second, p, 1e-8).value,
               {1e-12, 0, "identical sums"}));
  // A conducting plate close behind either coil takes coupling away, ferrite adds inductance.
  single.behind_first = plate(2e-3);
  CHECK(inductances(first, second, p, single).mutual.value < mutual(first, second, p).value);
  CHECK_FALSE(validity(single, first, second, 0).empty());
  // A coil that cuts a sheet is refused.
  Surroundings cut;
  cut.behind_first = plate(1e-3);
  CHECK_THROWS_AS(inductances(first, second, pose(first, second, {1e-3, 0, 0, 1.0}), cut),
                  std::invalid_argument);
}

TEST_CASE("sheets leave the coupling matrix positive definite", "[coil]") {
  std::mt19937 random(7);
  const auto between = [&](double low, double high) {
    return std::uniform_real_distribution<double>(low, high)(random);
  };
  Winding w;
  w.turns = 3, w.conductor.diameter = 0.5e-3, w.outer_diameter = 0.03, w.pitch = 1.5e-3;
  const Coil coil = build(w);
  for (int i = 0; i < 300; ++i) {
    Surroundings around;
    const auto any = [&] {
      return i % 3 ? ferrite(std::pow(10, between(0, 4)), between(1e-3, 5e-3)) : plate(between(1e-3, 5e-3));
    };
    if (i % 4 != 0) around.behind_first = any();
    if (i % 4 != 1) around.behind_second = any();
    const double tilt = i % 5 ? 0 : between(0, 0.1);
    const Pose p = pose(coil, coil, {between(2e-3, 0.02), between(0, 0.02), 0, tilt});
    const Inductances l = inductances(coil, coil, p, around, 1e-6);
    CHECK(l.first.value > 0);
    CHECK(l.second.value > 0);
    CHECK(l.mutual.value * l.mutual.value < l.first.value * l.second.value);
  }
}
