// SPDX-License-Identifier: MIT
// Coils from a file: what is read, what is refused and where, and the command from end to end.
#include <array>
#include <cstdio>

#include "engine/netlist/coil_file.h"
#include "tests/agrees.h"

using namespace couplet;
using Catch::Contains;
using couplet::test::agrees;

namespace {

const std::string pair_of_coils = R"(
title = "two flat coils"
frequency = "128 kHz"
[first]
shape = "flat_round"
turns = 10
outer_diameter = "44 mm"
inner_diameter = "19.5 mm"
diameter = "1 mm"
[second]
turns = 20
outer_diameter = "40.4 mm"
inner_diameter = "19.6 mm"
diameter = "0.4 mm"
[place]
gap = "4.3 mm"
tilt = "3 deg"
[behind_second]
material = "ferrite"
permeability = 200
distance = "0.5 mm"
[map]
gaps = { from = "1 mm", to = "5 mm", points = 5 }
shifts = ["4 mm", "0 mm"]
)";

struct Run {
  int status = -1;
  std::string text;
};

Run run(const std::string& arguments) {
  Run made;
  std::FILE* pipe = popen((std::string(COUPLET_PROGRAM) + " coil " + arguments + " 2>&1").c_str(), "r");
  REQUIRE(pipe);
  std::array<char, 4096> buffer;
  while (const size_t n = std::fread(buffer.data(), 1, buffer.size(), pipe))
    made.text.append(buffer.data(), n);
  made.status = WEXITSTATUS(pclose(pipe));
  return made;
}

}  // namespace

TEST_CASE("coil file: values in SI, overrides, series", "[coil]") {
  const CoilFile file = parse_coil_file(pair_of_coils, "pair.toml", {"place.gap=2 mm", "second.turns=18"});
  CHECK(file.title == "two flat coils");
  CHECK(file.first.outer_diameter == 44e-3);
  REQUIRE(file.second);
  CHECK(file.second->turns == 18);
  CHECK(file.place.gap == 2e-3);
  CHECK(agrees(file.place.tilt, 3 * coil::pi / 180, {1e-15, 0, "one product"}));
  REQUIRE(file.gaps.size() == 5);
  CHECK(agrees(file.gaps[3], 4e-3, {1e-14, 0, "arithmetic"}));
  CHECK(file.shifts == std::vector<double>{0, 4e-3});
  CHECK_FALSE(file.sheets.behind_first);
  REQUIRE(file.sheets.behind_second);
  CHECK(file.sheets.behind_second->permeability == 200);
}

TEST_CASE("coil file: everything wrong is said at once, with its place", "[coil]") {
  const std::string text = R"(frequency = "128 kHz"
[first]
shape = "flat_rond"
turns = 10.0
layers = 1.5
outer_diameter = "43"
diameter = "1 mm"
[place]
gap = "4 mm"
[behind_first]
permeability = 0.5
colour = "grey"
)";
  CHECK_THROWS_WITH(parse_coil_file(text, "x.toml"),
                    Contains("x.toml:3:9: shape cannot be \"flat_rond\"; did you mean \"flat_round\"?") &&
                        Contains("x.toml:5:10: layers of first must be a whole number") &&
                        Contains("x.toml:6:18: outer_diameter of first") &&
                        Contains("x.toml:8:1: [place] needs a second coil") &&
                        Contains("x.toml:10:1: behind_first has no material") &&
                        Contains("x.toml:11:16: permeability of behind_first is 0.5") &&
                        Contains("x.toml:12:1: unknown key \"colour\""));
  CHECK_THROWS_WITH(parse_coil_file("title = \"none\"", "x.toml"), Contains("there is no coil"));
  CHECK_THROWS_WITH(parse_coil_file("[first\n", "x.toml"), Contains("x.toml:1:"));
  // Turns that do not fit point at the key.
  CHECK_THROWS_WITH(parse_coil_file(pair_of_coils, "x.toml", {"first.turns=30"}),
                    Contains("turns of first: do not fit"));
  CHECK_THROWS_WITH(parse_coil_file(pair_of_coils, "x.toml", {"gap"}), Contains("write TABLE.KEY=VALUE"));
}

TEST_CASE("couplet coil, end to end", "[coil]") {
  const std::string pad = std::string(COUPLET_SOURCE) + "/netlists/coils/tool_crib_pad.toml";
  const Run table = run(pad + " --factor 0.45");
  CHECK(table.status == 0);
  CHECK_THAT(table.text, Contains("Coupling factor 0.45: at a gap of") && Contains("ICNIRP 2010") &&
                             Contains("Ladder of the second coil"));
  const Run json = run(pad + " --json -");
  CHECK(json.status == 0);
  CHECK_THAT(json.text, Contains("\"coupling\": {\"value\": 0.6") && Contains("\"map\": [") &&
                            !Contains("Tool crib pad and pack\nAt"));
  const Run tilted = run(pad + " --set place.tilt=\"40 deg\"");
  CHECK(tilted.status == 2);
  CHECK_THAT(tilted.text, Contains("tool_crib_pad.toml: the windings would touch"));
  CHECK(run("no_such_file.toml").status == 2);
}
