// SPDX-License-Identifier: MIT
#include "models/coil/ladder.h"

#include "models/coil/resistance.h"
#include "tests/agrees.h"

using namespace couplet::coil;
using couplet::test::agrees;

namespace {

void check_passive(const Ladder& ladder) {
  CHECK(ladder.resistance > 0);
  CHECK(ladder.inductance > 0);
  for (const Branch& b : ladder.branches) {
    CHECK(b.resistance > 0);
    CHECK(b.inductance > 0);
  }
  double before = 0;
  for (const double f : band(1e-3, 1e12, 200)) {
    CHECK(ladder.at(f).resistance >= before);
    before = ladder.at(f).resistance * (1 - 1e-14);
  }
}

}  // namespace

TEST_CASE("ladder: finds one that is there", "[coil]") {
  Ladder truth;
  truth.resistance = 0.12, truth.inductance = 20e-6;
  truth.branches = {{0.05, 0.3e-6}, {0.9, 0.4e-6}};
  std::vector<Sample> samples;
  for (const double f : band(5e3, 2e6)) samples.push_back(truth.at(f));
  const Ladder found = fit_ladder(samples, 1e-9);
  check_passive(found);
  REQUIRE(found.branches.size() == 2);
  const couplet::test::Tolerance same{1e-5, 0, "the fit stops where squared deviations no longer fall"};
  CHECK(agrees(found.resistance, truth.resistance, same));
  CHECK(agrees(found.inductance, truth.inductance, same));
  for (int i = 0; i < 2; ++i) {
    CHECK(agrees(found.branches[i].resistance, truth.branches[i].resistance, same));
    CHECK(agrees(found.branches[i].inductance, truth.branches[i].inductance, same));
  }
}

TEST_CASE("ladder: a lone round wire from dc to twenty times its resistance", "[coil]") {
  // The exact Bessel solution of 1 m of 1 mm copper and its internal inductance alone, the hardest case: L
  // falls too.
  const double copper = copper_resistivity(20), a = 0.5e-3, dc = copper / (pi * a * a);
  const auto exact = [&](double f) {
    const std::complex<double> z = dc * round_wire(a, skin_depth(f, copper));
    return Sample{f, z.real(), z.imag() / (2 * pi * f)};
  };
  std::vector<Sample> samples{{0, dc, 0}};
  for (const double f : band(1e3, 3e6)) samples.push_back(exact(f));
  const Ladder ladder = fit_ladder(samples, 0.01, 8);
  INFO(ladder.branches.size() << " branches, R off by " << ladder.resistance_deviation << " at "
                              << ladder.resistance_deviation_at << " Hz, L by " << ladder.inductance_deviation
                              << " at " << ladder.inductance_deviation_at);
  check_passive(ladder);
  CHECK(ladder.resistance_deviation < 0.01);
  CHECK(ladder.inductance_deviation < 0.01);
  // The deviation stated holds between the samples as well.
  for (const double f : band(1e3, 3e6, 317)) {
    CHECK(agrees(ladder.at(f).resistance, exact(f).resistance,
                 {1.2 * ladder.resistance_deviation, 0, "stated, and a fifth"}));
    CHECK(agrees(ladder.at(f).inductance, exact(f).inductance,
                 {1.2 * ladder.inductance_deviation, 0, "stated, and a fifth"}));
  }
}

TEST_CASE("ladder: a winding in its own field, and data that are none", "[coil]") {
  Winding w;
  w.turns = 10, w.outer_diameter = 0.044, w.inner_diameter = 0.0195, w.conductor.diameter = 1e-3;
  const Resistance r(build(w));
  std::vector<Sample> samples;
  for (const double f : band(10e3, 1e6)) {
    const Impedance z = r.at(f, 20);
    samples.push_back({f, z.resistance, 3.6e-6 + z.inductance_change});
  }
  const Ladder ladder = fit_ladder(samples);
  check_passive(ladder);
  CHECK(ladder.resistance_deviation < 0.01);
  CHECK(ladder.branches.size() <= 4);
  // Constant values need no branch; a resistance that falls with frequency cannot be met, and the miss is
  // stated.
  CHECK(fit_ladder({{1e3, 2, 1e-6}, {1e5, 2, 1e-6}}).branches.empty());
  const Ladder miss = fit_ladder({{1e3, 2, 1e-6}, {1e4, 1.5, 1e-6}, {1e5, 1, 1e-6}});
  check_passive(miss);
  CHECK(miss.resistance_deviation > 0.1);
  CHECK_THROWS_AS(fit_ladder({{1e3, 2, 1e-6}}), std::invalid_argument);
  CHECK_THROWS_AS(fit_ladder({{1e3, 2, 1e-6}, {1e4, -1, 1e-6}}), std::invalid_argument);
}
