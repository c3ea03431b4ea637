// SPDX-License-Identifier: MIT
#include <catch2/catch.hpp>
#include <cmath>

#include "engine/study/follow.h"
#include "engine/study/start.h"
#include "engine/study/steady_state.h"
#include "tests/agrees.h"

using namespace couplet;
using couplet::test::agrees;

namespace {

Design shipped(const std::string& name, const std::vector<std::string>& set = {}) {
  return read_netlist(std::string(COUPLET_SOURCE) + "/netlists/" + name + ".toml", set);
}

}  // namespace

TEST_CASE("the settled orbit is where a long march ends", "[settle]") {
  // 8 ms are more than ten of the slowest time constants (0.65 ms, the feed coils' loop) of every design.
  for (const char* name : {"dock", "crib", "buoy"}) {
    INFO(name);
    const Design design = shipped(name);
    const SteadyState s = run_settle(design);
    REQUIRE(s.orbit.kind == Orbit::Kind::plain);
    CHECK(s.orbit.largest_multiplier() < 1);
    StartOptions options;
    options.duration = 20e-3;
    const StartResult march = run_start(design, options);
    for (const char* figure : {"frequency", "supply.power", "load.power", "efficiency", "rail.mean", "rail.min", "rail.max", "regulator.headroom"}) {
      if (!s.figures.find(figure)) continue;
      INFO(figure);
      CHECK(agrees(s.figures.value(figure), march.figures.value(figure), {1e-7, 0, "20 ms are 30 slowest time constants: exp(-30) and round-off are far below"}));
    }
    CHECK(march.figures.value("ledger.residual") < 1e-9);
    CHECK(s.figures.value("ledger.residual") < 1e-9);
  }
}

TEST_CASE("a free orbit has a multiplier at 1, its field is the eigenvector, and Newton ends quadratically", "[settle]") {
  const SteadyState s = run_settle(shipped("dock"));
  CHECK(s.orbit.trivial_error < 1e-9);
  CHECK(s.orbit.field_error < 1e-9);
  CHECK(s.orbit.residual < 1e-11);
  // The last reductions: r_next <= constant r^2 until the floor of round-off at about 1e-13.
  const auto& r = s.orbit.residuals;
  bool quadratic = false;
  for (std::size_t k = 1; k < r.size(); ++k) quadratic = quadratic || (r[k - 1] < 1e-3 && r[k - 1] > 1e-9 && r[k] < 30 * r[k - 1] * r[k - 1] + 1e-12);
  CHECK(quadratic);
}

TEST_CASE("the slow multiplier of the loop choke-tank-choke is exp(-T R / L) as the coupling goes to zero", "[settle]") {
  // Both feed coils and the dock coil in one loop: 50 + 50 + 60 mohm over 47 + 47 + 10 uH. Closed form for a symmetric pair
  // whose switches and supply the loop current does not meet; exact only as the coupling goes to zero.
  const SteadyState s = run_settle(shipped("dock", {"factor=0.02"}));
  REQUIRE(s.orbit.found());
  const double expected = std::exp(-s.orbit.period * 0.160 / 104e-6);
  bool found = false;
  for (const auto& m : s.orbit.multipliers) found = found || std::abs(m - expected) < 1e-3;
  INFO(expected);
  CHECK(found);
}

TEST_CASE("a supply below the thresholds is at rest, in words", "[settle]") {
  const SteadyState s = run_settle(shipped("dock", {"supply=1.8 V"}));
  CHECK_FALSE(s.orbit.found());
  CHECK(s.orbit.sentence.find("rest") + s.orbit.sentence.find("no oscillation") != 2 * std::string::npos);
  const StartResult start = run_start(shipped("dock", {"supply=1.8 V"}), {});
  CHECK_FALSE(start.oscillates);
  CHECK(start.outcome.find("does not oscillate") == 0);
}

TEST_CASE("a scheduled change conserves energy in the ledger and moves the rail", "[start]") {
  Design design = shipped("dock");
  ScheduleEntry pull;
  pull.time.value = 3e-3;
  pull.changes["load"] = design.get("load");
  pull.changes["load"].value = 1e6;
  design.schedule.push_back(pull);
  ScheduleEntry gap;
  gap.time.value = 4e-3;
  gap.changes["factor"] = design.get("factor");
  gap.changes["factor"].value = 0.2;
  design.schedule.push_back(gap);
  const StartResult r = run_start(design, {});
  CHECK(r.report.usable());
  CHECK(r.ledger.relative() < 1e-9);
  CHECK(r.ledger.scheduled != 0);
  CHECK(r.figures.value("rail.highest") > 13);
}

TEST_CASE("a path agrees with settling cold at its points, both ways along it", "[follow]") {
  const Design design = shipped("dock");
  FollowOptions there;
  there.along = "load";
  there.from = 20;
  there.to = 8;
  FollowOptions back = there;
  std::swap(back.from, back.to);
  const Path down = follow(design, there), up = follow(design, back);
  REQUIRE(down.reached);
  REQUIRE(up.reached);
  CHECK(agrees(down.points.back().figures.value("frequency"), up.points.front().figures.value("frequency"), {1e-9, 0, "the same orbit, both solved to 1e-11"}));
  const auto& middle = down.points[down.points.size() / 2];
  Design cold = design;
  cold.set("load", middle.value);
  const SteadyState s = run_settle(cold);
  CHECK(agrees(middle.figures.value("rail.mean"), s.figures.value("rail.mean"), {1e-9, 0, "the same orbit, both solved to 1e-11"}));
  CHECK(middle.stable);
}

TEST_CASE("wrong use of follow is one clear message", "[follow]") {
  FollowOptions options;
  options.along = "laod";
  options.from = 1, options.to = 2;
  CHECK_THROWS_WITH(follow(shipped("dock"), options), Catch::Contains("did you mean \"load\""));
  options.along = "load";
  options.to = 1;
  CHECK_THROWS_WITH(follow(shipped("dock"), options), Catch::Contains("give a range"));
}
