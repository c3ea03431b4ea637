// SPDX-License-Identifier: MIT
// Captures in many styles, all invented: read right or refused, never read wrong. The files hold one
// waveform, a 140 kHz tank of 5 V that decays in 40 us and its current; every row that is read is compared
// with the formula.
#include "engine/capture/csv.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "tests/agrees.h"

namespace couplet::capture {
namespace {

double tank(double t) {
  return t < -0.2e-6 ? 0 : 5 * std::exp(-t / 40e-6) * std::cos(2 * std::numbers::pi * 140e3 * t);
}
double feed(double t) {
  return t < -0.2e-6 ? 0 : 0.8 * std::exp(-t / 40e-6) * std::sin(2 * std::numbers::pi * 140e3 * t);
}

struct Case {
  std::string file;
  std::string refusal;  // empty: is read
  std::size_t points = 200;
  std::size_t channels = 1;
  std::vector<std::string> notes = {};  // each must occur in a note; none: no note but those on separators
  CsvOptions options = {};
  double rounding = 6e-6;  // [V] of the printed values
  double start = 0;        // [s]
  double rate = 2e6;       // [Hz]; 0: times as the file has them
};

const std::vector<Case> cases{
    {"comma.csv", ""},
    {"semicolon_decimal_comma.csv", ""},
    {"tab_unit_row.csv", "", 200, 2},
    {"second_volt.csv", "", 200, 1, {}, {}, 6e-5},
    {"byte_order_mark.csv", ""},
    {"latin1.csv", ""},
    {"utf16.csv", ""},
    {"start_increment_columns.csv", "", 200, 1, {"time from the header"}, {}, 6e-6, -10e-6},
    {"interval_in_header.csv", "", 200, 1, {"time from the header"}, {}, 6e-6, -10e-6},
    {"rate_and_index.csv", "", 200, 1, {"AC coupling", "time from the header"}},
    {"header_at_left.csv", "", 200, 1, {"probe factor of 1"}},
    {"units_by_row.csv", "", 200, 1, {}, {}, 6e-5},
    {"unit_columns.csv", "", 200, 1, {}, {}, 6e-5},
    {"divisions_with_scale.csv", "", 200, 2, {}, {}, 1.2e-5},
    {"divisions_without_scale.csv", ":1: CH1 is in divisions"},
    {"divisions_of_other_channels.csv", ":1: volts per division for 4 channels"},
    {"divisions_with_position.csv", ":2: values in divisions with a vertical position"},
    {"uneven.csv", "", 200, 1, {"not evenly spaced"}, {}, 6e-6, 0, 0},
    {"repeated_rows.csv", "", 200, 1, {"2 rows repeat"}},
    {"two_values_at_one_time.csv", ":53: two different values of tank"},
    {"time_unit_changes_unmarked.csv", ":4: time runs back"},
    {"reversed.csv", "", 200, 1, {"turned round"}},
    {"time_with_few_digits.csv", "", 200, 1, {"too few digits"}, {}, 0.5, 0, 1 / 0.35e-6},
    {"interpolated_straight.csv",
     "",
     400,
     1,
     {"one row in 5 is a sample, the others were interpolated"},
     {},
     6,
     0,
     2.5e6},
    {"interpolated_smooth.csv",
     "",
     1024,
     1,
     {"one row in 4 is a sample, the others were interpolated"},
     {},
     0.6,
     0,
     4e6},
    {"clipped.csv", "", 400, 1, {"flat bottom at -2 V", "flat top at 2 V"}, {}, 3.1, 0, 4e6},
    {"marks.csv", "", 200, 1, {"4 rows without a value", "over range"}},
    {"no_units.csv", ":1: the time column has no unit"},
    {"no_units.csv", ":1: tank has no unit", 0, 0, {}, {"us", "", {}}},
    {"no_units.csv", "", 200, 1, {}, {"us", "V", {}}},
    {"comma_for_both.csv", ":2: commas may be separators or decimal marks"},
    {"thousands.csv", ":2: every comma stands before exactly three digits"},
    {"milli_or_mega.csv", ":1: unit \"MV\" may be milli or mega"},
    {"two_records.csv", ":52: \"time (us)\" stands between rows of numbers"},
    {"torn.csv", "", 199, 1, {"line 201"}, {}, 6e-5},
    {"value_unit_changes_unmarked.csv", "its unit seems to change from row to row"},
    {"interval_contradicts.csv", ":2: the header says 1e-06 s between samples, the time column 5e-07 s"},
    {"codes.csv", ":1: tank is in converter codes"},
    {"clock_time.csv", "no rows of numbers"},
    {"probe_forgotten.csv",
     "",
     200,
     2,
     {"CH1: the oscilloscope was set to a probe factor of 1", "CH1 and CH2 have one shape, 10 times apart"},
     {},
     6,
     0,
     2e6},
    {"probe_forgotten.csv",
     "",
     200,
     2,
     {"CH1: probe factor 10 as given"},
     {"", "", {{"CH1", 10}}},
     6,
     0,
     2e6},
    {"interval_in_header.csv",
     "",
     200,
     1,
     {"probe factor 10 as given; the file was written with 10, so volts times 1", "time from the header"},
     {"", "", {{"", 10}}},
     6e-6,
     -10e-6},
    {"time_twice.csv", "", 200, 2, {"a second time column repeats"}},
    {"gap.csv",
     "",
     185,
     1,
     {"not evenly spaced: steps from 5e-07 s to 8e-06 s, the longest at 3.95e-05 s"},
     {},
     6e-6,
     0,
     0},
    {"lettered_channels.csv", "", 200, 2, {"1 lines of text behind the data"}},
    {"lettered_without_units.csv", ":1: A has no unit"},
    {"text_in_data.csv", ":32: \"15.00\""},
    {"empty.csv", "the file is empty"},
    {"binary.csv", "binary file"},
    {"not_there.csv", "cannot be read"},
};

std::string joined(const std::vector<std::string>& notes) {
  std::string all;
  for (const std::string& note : notes) all += note + "\n";
  return all;
}

TEST_CASE("captures of many styles are read right or refused") {
  REQUIRE(cases.size() >= 20);
  for (const Case& it : cases) {
    INFO(it.file << " " << it.options.time_unit << it.options.unit << it.options.probe.size());
    const CsvReading reading = read_csv_file(COUPLET_SOURCE "/tests/capture/files/" + it.file, it.options);
    const Capture& capture = reading.capture;
    if (!it.refusal.empty()) {
      CHECK_THAT(reading.refusal, Catch::Contains(it.refusal));
      CHECK(capture.channels.empty());
      continue;
    }
    CHECK(reading.refusal == "");
    if (!reading) continue;
    const std::string notes = joined(capture.notes);
    for (const std::string& note : it.notes) CHECK_THAT(notes, Catch::Contains(note));
    if (it.notes.empty() && notes.find("cells parted") == std::string::npos) CHECK(notes == "");
    CHECK(capture.time.size() == it.points);
    REQUIRE(capture.channels.size() == it.channels);
    const bool even = it.rate > 0;
    CHECK(capture.uniform == even);
    double worst_time = 0;
    for (std::size_t i = 0; even && i < capture.time.size(); ++i) {
      worst_time =
          std::max(worst_time, std::abs(capture.time[i] - (it.start + static_cast<double>(i) / it.rate)));
    }
    // Times with few digits are put back on a grid that is known to a tenth of the last digit, 1 us.
    CHECK(worst_time < (it.file == "time_with_few_digits.csv" ? 1e-7 : 1e-11));
    for (std::size_t c = 0; c < it.channels; ++c) {
      const Channel& channel = capture.channels[c];
      REQUIRE(channel.values.size() == capture.time.size());
      double worst = 0;
      for (std::size_t i = 0; i < capture.time.size(); ++i) {
        if (!std::isfinite(channel.values[i])) continue;
        const bool current = c == 1 && it.file != "probe_forgotten.csv";
        worst = std::max(worst, std::abs(channel.values[i] - (current ? feed : tank)(capture.time[i])));
      }
      CHECK(worst < it.rounding);
    }
  }
}

TEST_CASE("names and units of channels") {
  const std::string folder = COUPLET_SOURCE "/tests/capture/files/";
  const Capture tab = read_csv_file(folder + "tab_unit_row.csv").capture;
  CHECK(tab.channels[0].name == "tank");
  CHECK(tab.channels[0].unit == "V");
  CHECK(tab.channels[1].unit == "A");
  const Capture letters = read_csv_file(folder + "lettered_channels.csv").capture;
  CHECK(letters.channels[0].name == "A");
  CHECK(letters.channels[0].unit == "V");
  const Capture marks = read_csv_file(folder + "marks.csv").capture;
  CHECK(marks.channels[0].clipped_high);
  CHECK(marks.channels[0].clipped_low);
  const Capture probe = read_csv_file(folder + "probe_forgotten.csv", {"", "", {{"CH1", 10}}}).capture;
  CHECK(probe.channels[0].values[0] == Approx(5));
  CHECK(probe.channels[1].values[0] == Approx(5));
}

TEST_CASE("a cut anywhere in a file is read right or refused") {
  // Every prefix of a small file: whatever is read must lie on the waveform.
  std::string text = "time (us),tank (V)\n";
  for (int i = 0; i < 12; ++i) {
    char row[64];
    std::snprintf(row, sizeof row, "%.2f,%.4e\n", 0.5 * i, tank(0.5e-6 * i));
    text += row;
  }
  for (std::size_t length = 0; length <= text.size(); ++length) {
    const CsvReading reading = read_csv(text.substr(0, length), "cut.csv");
    if (!reading) continue;
    INFO("cut after " << length);
    double worst = 0;
    for (std::size_t i = 0; i < reading.capture.time.size(); ++i) {
      if (!std::isfinite(reading.capture.channels[0].values[i])) continue;
      worst =
          std::max(worst, std::abs(reading.capture.channels[0].values[i] - tank(reading.capture.time[i])));
    }
    CHECK(worst < 6e-4);  // half of the last printed digit of 5.0000, and of its neighbours by decade
  }
}

}  // namespace
}  // namespace couplet::capture
