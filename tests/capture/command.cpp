// SPDX-License-Identifier: MIT
// `couplet capture` as it is called from a shell.
#include <sys/wait.h>

#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <numbers>

#include "engine/record/record.h"
#include "tests/agrees.h"

namespace couplet {
namespace {

using couplet::test::agrees;

struct Call {
  int status;
  std::string text;  // output and complaints
  /// The number behind "NAME": {"value": in the JSON output.
  double figure(const std::string& name) const {
    const std::string mark = "\"" + name + "\": {\"value\": ";
    const std::size_t at = text.find(mark);
    return at == std::string::npos ? std::nan("") : std::atof(text.c_str() + at + mark.size());
  }
};

std::filesystem::path scratch(const std::string& name) {
  const auto folder = std::filesystem::temp_directory_path() / "couplet_test_capture";
  std::filesystem::create_directories(folder);
  return folder / name;
}

Call call(const std::string& arguments) {
  const std::string out = scratch("output").string();
  const int code =
      std::system((std::string(COUPLET_PROGRAM) + " " + arguments + " >" + out + " 2>&1").c_str());
  std::ifstream stream(out);
  return {WEXITSTATUS(code), {std::istreambuf_iterator<char>(stream), {}}};
}

const std::string files = COUPLET_SOURCE "/tests/capture/files/";

TEST_CASE("couplet capture: ring-down to inductance") {
  const Call run = call("capture " + files + "comma.csv --capacitor \"47 nF +- 2 %\" --json -");
  CHECK(run.status == 0);
  const double omega = 2 * std::numbers::pi * 140e3;
  const double inductance = 1 / (47e-9 * (omega * omega + 25e3 * 25e3));
  CHECK(agrees(run.figure("coil.inductance"), inductance, {1e-6, 0, "values printed to 10 uV of 5 V"}));
  CHECK(agrees(run.figure("coil.resistance"), 2 * 25e3 * inductance,
               {1e-5, 0, "values printed to 10 uV of 5 V"}));
  CHECK(agrees(run.figure("coil.inductance.tolerance.high") / inductance, 1 / 0.98, {1e-6, 0, "as above"}));
}

TEST_CASE("couplet capture: statuses and complaints") {
  CHECK(call("capture " + files + "divisions_without_scale.csv").status == 2);
  CHECK(call("capture " + files + "comma.csv --capacitor \"47 nH\"").status == 2);
  CHECK(call("capture").status == 2);
  const Call several = call("capture " + files + "tab_unit_row.csv");
  CHECK(several.status == 2);
  CHECK_THAT(several.text, Catch::Contains("tank, feed"));
  const Call two = call("capture " + files + "comma.csv --modes 2");
  CHECK(two.status == 3);
  CHECK_THAT(two.text, Catch::Contains("no ring-down to use"));
}

TEST_CASE("couplet capture: coupling from readings") {
  const Call run = call(
      "capture --reading aiding=\"3.337 uH +- 1 %\" --reading opposing=\"1.992 uH +- 1 %\" --reading "
      "first=\"1.67 uH +- "
      "1 %\" --reading second=\"1.025 uH +- 1 %\" --json -");
  CHECK(run.status == 0);
  CHECK(agrees(run.figure("coupling"), 0.257, {0, 0.0005, "AF5LA's loops, printed to three digits"}));
  CHECK(agrees(run.figure("coupling.consistency"), -0.011, {0, 0.0005, "printed to 0.1 %"}));
}

TEST_CASE("couplet capture: a capture over a record") {
  const std::string record = scratch("dock.record").string();
  call("start " COUPLET_SOURCE "/netlists/dock.toml --duration \"100 us\" --quiet --force --out " + record);
  const RecordReader reader(record);
  const auto signal = reader.signal("voltage of left");
  REQUIRE(signal >= 0);
  const auto time = reader.full_time();
  const auto value = reader.full(signal);
  // "Measured": the record's own samples, 7 us late by the oscilloscope's clock and 5 % too large.
  std::ofstream csv(scratch("measured.csv"));
  csv.precision(12);
  csv << "time (us),left (V)\n";
  double last = -1;
  for (std::size_t i = 0; i < time.size(); ++i) {
    if (time[i] - last < 1e-9) continue;
    last = time[i];
    csv << time[i] * 1e6 + 7 << "," << 1.05 * value[i] << "\n";
  }
  csv.close();
  const Call run = call("capture " + scratch("measured.csv").string() + " --against " + record +
                        " --signal \"voltage of left\" --json -");
  INFO(run.text);
  CHECK(run.status == 0);
  CHECK(agrees(run.figure("overlay.shift"), -7e-6, {0, 1e-9, "straight lines between samples"}));
  CHECK(agrees(run.figure("overlay.amplitude.ratio"), 1.05, {1e-3, 0, "straight lines between samples"}));
  CHECK(agrees(run.figure("overlay.frequency.ratio"), 1, {1e-4, 0, "straight lines between samples"}));
  const Call unknown =
      call("capture " + files + "comma.csv --against " + record + " --signal \"voltage of nothing\"");
  CHECK(unknown.status == 2);
  CHECK_THAT(unknown.text, Catch::Contains("voltage of left"));
}

}  // namespace
}  // namespace couplet
