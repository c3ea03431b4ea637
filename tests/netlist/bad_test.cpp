// SPDX-License-Identifier: MIT
// Every file in tests/netlist/bad is refused with exactly the complaints in its "# expect: " lines, each as
// LINE:COLUMN: words (without the file's name), in that order. A new wrong netlist is a new file.
#include <catch2/catch.hpp>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "engine/netlist/netlist.h"

using namespace couplet;

namespace {

std::vector<std::string> lines_beginning(const std::string& text, const std::string& head) {
  std::vector<std::string> found;
  std::istringstream in(text);
  for (std::string line; std::getline(in, line);) {
    if (line.rfind(head, 0) == 0) found.push_back(line.substr(head.size()));
  }
  return found;
}

std::string slurp(const std::filesystem::path& path) {
  std::ifstream in(path, std::ios::binary);
  std::ostringstream text;
  text << in.rdbuf();
  return text.str();
}

}  // namespace

TEST_CASE("wrong netlists are refused with the words expected") {
  int count = 0;
  for (const auto& entry : std::filesystem::directory_iterator(std::string(COUPLET_SOURCE) + "/tests/netlist/bad")) {
    const std::string text = slurp(entry.path());
    const auto expected = lines_beginning(text, "# expect: ");
    INFO(entry.path().filename().string());
    REQUIRE_FALSE(expected.empty());
    std::string said;
    try {
      parse_netlist(text, "F");
    } catch (const InputError& error) {
      said = error.what();
    }
    CHECK(lines_beginning(said, "F:") == expected);
    ++count;
  }
  CHECK(count >= 40);
}

TEST_CASE("hostile bytes are refused, not crashed on") {
  const std::string garbage(1 << 20, '\xff');
  CHECK_THROWS_AS(parse_netlist(garbage, "F"), InputError);
  CHECK_THROWS_AS(parse_netlist(std::string("title = \"a\0b\"", 13), "F"), InputError);
  std::string deep = "a = ";
  for (int i = 0; i < 5000; ++i) deep += "[";
  CHECK_THROWS_AS(parse_netlist(deep, "F"), InputError);
  CHECK_THROWS_AS(read_netlist("/no/such/file.toml"), InputError);
  CHECK_THROWS_AS(read_netlist("/"), InputError);
}

TEST_CASE("overrides take a unit and are checked") {
  const std::string dock = std::string(COUPLET_SOURCE) + "/netlists/dock.toml";
  CHECK(read_netlist(dock, {"load=20 ohm"}).get("load").value == 20);
  CHECK(read_netlist(dock, {"dock_coil.inductance=12 uH"}).get("dock_coil.inductance").value == 12e-6);
  CHECK_THROWS_WITH(read_netlist(dock, {"load=20 V"}), Catch::Contains("another dimension"));
  CHECK_THROWS_WITH(read_netlist(dock, {"laod=20 ohm"}), Catch::Contains("did you mean \"load\""));
  CHECK_THROWS_WITH(read_netlist(dock, {"load=-5 ohm"}), Catch::Contains("must lie between"));
  CHECK_THROWS_WITH(read_netlist(dock, {"factor=1.5"}), Catch::Contains("positive definite"));
}

TEST_CASE("every shipped design reads, and its sheet is the same each time") {
  for (const char* name : {"dock", "crib", "buoy"}) {
    const Design design = read_netlist(std::string(COUPLET_SOURCE) + "/netlists/" + name + ".toml");
    const Sheet a = build_sheet(design), b = build_sheet(design);
    CHECK(a.nodes == b.nodes);
    CHECK(a.branches.size() == b.branches.size());
    CHECK(design.sha256.size() == 64);
  }
}
