// SPDX-License-Identifier: MIT
#include "models/coil/field.h"

#include "models/coil/link.h"
#include "tests/agrees.h"

using namespace couplet::coil;
using couplet::test::agrees;

namespace {

Coil single_layer(double radius, double turns) {
  Winding w;
  w.conductor.diameter = 1e-5, w.turns = turns, w.pitch = 1e-5, w.shape = Shape::solenoid;
  w.outer_diameter = 2 * radius + 1e-5;
  return build(w);
}

}  // namespace

TEST_CASE("reference levels of ICNIRP 2010", "[coil]") {
  // 3 kHz to 10 MHz seen in a reproduction of the table; the rest from memory.
  CHECK(reference_level(3e3, Exposure::general_public) == 27e-6);
  CHECK(reference_level(128e3, Exposure::general_public) == 27e-6);
  CHECK(reference_level(10e6, Exposure::occupational) == 100e-6);
  CHECK(reference_level(50, Exposure::general_public) == 200e-6);
  CHECK(reference_level(50, Exposure::occupational) == 1e-3);
  // The table is continuous at its borders, to the two digits it is printed with.
  for (const double f : {8.0, 25.0, 400.0, 300.0, 3000.0})
    for (const Exposure e : {Exposure::general_public, Exposure::occupational})
      CHECK(agrees(reference_level(f * 0.999999, e), reference_level(f, e),
                   {0.02, 0, "printed with one or two digits"}));
  CHECK_THROWS_AS(reference_level(20e6, Exposure::general_public), std::invalid_argument);
}

TEST_CASE("field on the axis and shares of the levels", "[coil]") {
  // Ten turns of 40 mm radius with 2 A rms: 77, 16 and 5.4 uT at 50, 100 and 150 mm (on-axis closed form).
  Scene scene{single_layer(0.04, 10), single_layer(0.02, 5), {}, {}};
  scene.second_in_first.shift.z() = 0.02;
  for (const double z : {0.05, 0.1, 0.15}) {
    const FieldAt here = field_at(scene, {{128e3, 2, 0}}, {Point(0, 0, z)})[0];
    const double closed = mu0 * 10 * 2 * 0.0016 / (2 * std::pow(0.0016 + z * z, 1.5));
    CHECK(agrees(here.flux_density, closed, {1e-5, 0, "ten turns over 0.1 mm taken as one place"}));
    CHECK(agrees(here.public_share, closed / 27e-6, {1e-5, 0, "the same"}));
    CHECK(agrees(here.occupational_share, closed / 100e-6, {1e-5, 0, "the same"}));
  }
  // Opposite currents cancel, currents in quadrature add as squares, harmonics add as shares.
  const Point at(0.03, 0.01, 0.06);
  const double first = field_at(scene, {{1e5, 1, 0}}, {at})[0].flux_density;
  const double both = field_at(scene, {{1e5, 1, 0}, {3e5, 1, 0}}, {at})[0].flux_density;
  CHECK(agrees(both, first * std::sqrt(2), {1e-12, 0, "arithmetic"}));
  CHECK(agrees(field_at(scene, {{1e5, 1, 0}, {3e5, 1, 0}}, {at})[0].public_share, 2 * first / 27e-6,
               {1e-12, 0, "arithmetic"}));
  CHECK(field_at(scene, {{1e5, {0, 1}, 0}}, {at})[0].flux_density == first);
  // Two equal coils in one place: opposite currents cancel, equal ones double; a second coil elsewhere is a
  // first moved.
  Scene twice{scene.first, scene.first, {}, {}};
  CHECK(field_at(twice, {{1e5, 1, -1}}, {at})[0].flux_density < 1e-12 * first);
  CHECK(agrees(field_at(twice, {{1e5, 1, 1}}, {at})[0].flux_density, 2 * first, {1e-12, 0, "arithmetic"}));
  twice.second_in_first.shift = Point(0.01, -0.02, 0.03);
  CHECK(agrees(field_at(twice, {{1e5, 0, 1}}, {Point(at + twice.second_in_first.shift)})[0].flux_density,
               first, {1e-12, 0, "the same field elsewhere"}));
  // A point further away is never worse, and the worst one is at least as bad as the axis.
  double before = 1e9;
  for (const double d : {0.01, 0.05, 0.1, 0.3}) {
    const FieldAt worst = largest_field(scene, {{1e5, 1, -0.5}}, d);
    CHECK(worst.public_share < before);
    before = worst.public_share;
  }
  CHECK(largest_field(scene, {{1e5, 1, 0}}, 0.05).flux_density >=
        field_at(scene, {{1e5, 1, 0}}, {Point(0, 0, 0.02 + scene.second.height / 2 + 0.05)})[0].flux_density);
  CHECK(field_caution().find("no compliance test") != std::string::npos);
}

TEST_CASE("link: one call from a drawing to part values", "[coil]") {
  LinkGeometry g;
  g.first.turns = 10, g.first.outer_diameter = 0.044, g.first.inner_diameter = 0.0195,
  g.first.conductor.diameter = 1e-3;
  g.second.turns = 20, g.second.outer_diameter = 0.0404, g.second.inner_diameter = 0.0196,
  g.second.conductor.diameter = 0.4e-3;
  g.place.gap = 5e-3 - 0.7e-3;
  const LinkValues v = link_values(g, 0);
  // The concentric-circle model, computed with 20 digits.
  CHECK(agrees(v.first, 3.58403549095e-6, {1e-11, 0, "12 digits"}));
  CHECK(agrees(v.mutual, 3.991078054466e-6, {1e-11, 0, "12 digits"}));
  CHECK(agrees(v.coupling, 0.5518266479752, {1e-11, 0, "12 digits"}));
  CHECK(v.first_resistance == v.first_resistance_dc);
  const LinkValues hot = link_values(g, 128e3, 90);
  CHECK(agrees(hot.first_resistance_dc / v.first_resistance_dc, 1.2751, {1e-12, 0, "IEC 60028"}));
  CHECK(hot.first_resistance > hot.first_resistance_dc);
  CHECK(hot.first < v.first);
  CHECK_FALSE(hot.notes.empty());
  // Best efficiency, computed from the closed form: k, Q1, Q2.
  CHECK(agrees(best_efficiency(0.3, 100, 80), 0.928190435655, {1e-11, 0, "12 digits"}));
  CHECK(agrees(best_efficiency(0.1, 150, 100), 0.849490590301, {1e-11, 0, "12 digits"}));
  CHECK(agrees(best_efficiency(0.02, 300, 300), 0.717624303872, {1e-11, 0, "12 digits"}));
  // Two equal tanks split to f0/sqrt(1 + k) and f0/sqrt(1 - k): the coupling matrix as an eigenvalue problem.
  LinkGeometry equal = g;
  equal.second = equal.first;
  const LinkValues e = link_values(equal, 0);
  Eigen::Matrix2d matrix;
  matrix << e.first, e.mutual, e.mutual, e.second;
  const Eigen::Vector2d values = Eigen::SelfAdjointEigenSolver<Eigen::Matrix2d>(matrix).eigenvalues();
  CHECK(agrees(values[0], e.first * (1 - e.coupling), {1e-13, 0, "two equal coils"}));
  CHECK(agrees(values[1], e.first * (1 + e.coupling), {1e-13, 0, "two equal coils"}));
  g.place = {0.5e-3, 0, 0, 0.5};
  CHECK_THROWS_WITH(link_values(g, 0), Catch::Contains("would touch"));
  g.second.turns = 200;
  g.first.outer_diameter = 0;
  CHECK_THROWS_WITH(link_values(g, 0),
                    Catch::Contains("first: outer_diameter") && Catch::Contains("second: turns"));
  // Rectangular over round, tilted, with sheets behind both: all roads meet in one call.
  LinkGeometry mixed;
  mixed.first.shape = Shape::flat_rectangular;
  mixed.first.turns = 4, mixed.first.pitch = 1.5e-3, mixed.first.outer_length = 0.05,
  mixed.first.outer_width = 0.04;
  mixed.first.corner_radius = 5e-3, mixed.first.conductor.kind = Conductor::Kind::trace;
  mixed.first.conductor.width = 1e-3, mixed.first.conductor.thickness = 70e-6;
  mixed.second.turns = 5, mixed.second.pitch = 1e-3, mixed.second.outer_diameter = 0.035,
  mixed.second.conductor.diameter = 0.5e-3;
  Plane sheet;
  sheet.permeability = 100, sheet.distance = 1e-3, sheet.thickness = 0.5e-3, sheet.reach = 0.02;
  mixed.sheets.behind_first = mixed.sheets.behind_second = sheet;
  mixed.place = {5e-3, 3e-3, 1e-3, 0.05};
  const LinkValues m = link_values(mixed, 128e3);
  CHECK(m.coupling > 0.2);
  CHECK(m.coupling < 1);
  CHECK(m.notes.size() >= 6);
}
