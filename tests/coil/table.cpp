// SPDX-License-Identifier: MIT
#include "models/coil/table.h"

#include <algorithm>
#include <random>

#include "models/coil/link.h"
#include "tests/agrees.h"

using namespace couplet::coil;
using couplet::test::agrees;

namespace {

LinkGeometry two_flat_coils() {  // invented
  LinkGeometry g;
  g.first.turns = 10, g.first.outer_diameter = 0.043, g.first.inner_diameter = 0.0205,
  g.first.conductor.diameter = 0.8e-3;
  g.second.turns = 20, g.second.outer_diameter = 0.040, g.second.inner_diameter = 0.020,
  g.second.conductor.diameter = 0.4e-3;
  Plane sheet;
  sheet.permeability = 200, sheet.distance = 0.5e-3;
  g.sheets.behind_second = sheet;
  return g;
}

}  // namespace

TEST_CASE("table: positive definite between the points, whatever the points are", "[coil]") {
  // Couplings of both signs close to one, at random: any interpolation of L and M themselves would fail here.
  std::mt19937 random(11);
  const auto between = [&](double low, double high) {
    return std::uniform_real_distribution<double>(low, high)(random);
  };
  for (int table = 0; table < 20; ++table) {
    std::vector<TableRow> rows;
    for (const double gap : {1e-3, 2e-3, 5e-3, 9e-3})
      for (const double shift : {0.0, 4e-3, 20e-3})
        for (const double tilt : {-0.1, 0.1}) {
          const double first = std::pow(10, between(-6, -4)), second = std::pow(10, between(-6, -4));
          const double k = between(0, 1) < 0.5 ? between(0.9, 0.9999) : -between(0.9, 0.9999);
          rows.push_back(
              {{gap, shift, tilt},
               {first, second, k * std::sqrt(first * second), between(0.01, 1), between(0.01, 1)}});
        }
    std::shuffle(rows.begin(), rows.end(), random);
    const PositionTable made(rows);
    for (const TableRow& row : rows) {
      const PairValues v = made.at(row.position);
      CHECK(agrees(v.mutual, row.values.mutual, {1e-11, 0, "artanh near 1 costs four digits"}));
      CHECK(agrees(v.first, row.values.first, {1e-13, 0, "logarithm and back"}));
    }
    for (int i = 0; i < 500; ++i) {
      const PairValues v = made.at({between(1e-3, 9e-3), between(0, 20e-3), between(-0.1, 0.1)});
      CHECK(v.first > 0);
      CHECK(v.second > 0);
      CHECK(v.mutual * v.mutual < v.first * v.second);
      CHECK(v.first_resistance >= 0.01 * (1 - 1e-12));
      CHECK(v.first_resistance <= 1);  // no overshoot
    }
  }
}

TEST_CASE("table: from geometry, against the geometry between its points", "[coil]") {
  const LinkGeometry g = two_flat_coils();
  std::vector<double> gaps, shifts;
  for (int i = 0; i <= 12; ++i) gaps.push_back(1e-3 * std::pow(20, i / 12.0));
  for (int i = 0; i <= 10; ++i) shifts.push_back(2e-3 * i);
  const PositionTable table(tabulate(g, gaps, shifts, {0}, 128e3));
  const Link link(g.first, g.second, g.sheets);
  for (const auto& [gap, shift] : {std::pair{2.7e-3, 3e-3}, {6.1e-3, 8.7e-3}, {13e-3, 0.4e-3}}) {
    const LinkValues exact = link.at({gap, shift, 0, 0}, 128e3);
    const PairValues v = table.at({gap, shift, 0});
    CHECK(
        agrees(v.coupling(), exact.coupling, {0.01, 0, "cubic over steps of 28 % in gap and 2 mm in shift"}));
    CHECK(agrees(v.first, exact.first, {0.002, 0, "the same; the inductance bends less"}));
    CHECK(agrees(v.first_resistance, exact.first_resistance, {1e-9, 0, "does not depend on the position"}));
  }
  // The self-inductance near the other coil's sheet moves.
  CHECK(table.at({1e-3, 0, 0}).first > 1.1 * table.at({20e-3, 0, 0}).first);
  // k -> gap and back.
  for (const double gap : {1e-3, 1.5e-3, 7.7e-3, 20e-3}) {
    const std::vector<double> found = table.gaps_for(table.coupling({gap, 0, 0}));
    REQUIRE(found.size() == 1);
    CHECK(agrees(found[0], gap, {1e-9, 0, "root finding to 50 bits, slope of k"}));
  }
  CHECK(table.gaps_for(0.99).empty());
  CHECK_THROWS_WITH(table.at({25e-3, 0, 0}),
                    Catch::Contains("gap 25 mm lies outside the table (1 to 20 mm)"));
  CHECK_THROWS_AS(table.at({5e-3, 0, 0.1}), std::out_of_range);
}

TEST_CASE("table: one that is not monotone gives every gap", "[coil]") {
  std::vector<TableRow> rows;
  const double k[] = {0.1, 0.3, 0.2, 0.25};
  for (int i = 0; i < 4; ++i) rows.push_back({{1e-3 * i, 0, 0}, {1e-6, 1e-6, k[i] * 1e-6, 0, 0}});
  const PositionTable table(rows);
  CHECK(table.gaps_for(0.22).size() == 3);
  CHECK(table.gaps_for(0.3).size() == 1);
  CHECK(table.at({1.5e-3, 0, 0}).first_resistance == 0);
}

TEST_CASE("table: bad ones are refused with the place", "[coil]") {
  const auto complaints = [](std::vector<TableRow> rows) {
    try {
      PositionTable table(rows);
    } catch (const TableError& error) {
      return error.complaints;
    }
    return std::vector<TableComplaint>{};
  };
  std::vector<TableRow> rows;
  for (const double gap : {1e-3, 2e-3})
    for (const double shift : {0.0, 5e-3}) rows.push_back({{gap, shift, 0}, {1e-6, 4e-6, 1e-6, 0.1, 0.1}});
  CHECK(complaints(rows).empty());
  auto bad = rows;
  bad[2].values.mutual = 2.5e-6;
  bad[3].values.first = -1;
  REQUIRE(complaints(bad).size() == 2);
  CHECK(complaints(bad)[0].row == 3);
  CHECK(complaints(bad)[0].text.find("gap 2 mm, shift 0 mm") != std::string::npos);
  CHECK(complaints(bad)[0].text.find("2.5 uH is not below sqrt(L1 L2) = 2 uH") != std::string::npos);
  CHECK(complaints(bad)[1].row == 4);
  bad = rows;
  bad.pop_back();
  REQUIRE(complaints(bad).size() == 1);
  CHECK(complaints(bad)[0].text.find("gap 2 mm, shift 5 mm, tilt 0 deg is missing") != std::string::npos);
  bad = rows;
  bad.push_back(rows[1]);
  REQUIRE(complaints(bad).size() == 1);
  CHECK(complaints(bad)[0].row == 5);
  bad = rows;
  bad[1].values.second_resistance = 0;
  CHECK(complaints(bad).size() == 1);
  CHECK(complaints({}).size() == 1);
}
