// SPDX-License-Identifier: MIT
// The stages between a capture's text and its channels; only the csv_*.cpp files see this.
#pragma once

#include <cstddef>
#include <map>
#include <optional>
#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

#include "engine/capture/csv.h"

namespace couplet::capture {

/// Thrown inside the reader, caught by read_csv.
struct Refusal : std::runtime_error {
  Refusal(std::size_t at, const std::string& what) : std::runtime_error(what), line(at) {}
  std::size_t line;  // 1 is the first; 0: the file as a whole
};

// ---- units (csv_units.cpp)

struct Unit {
  double factor = 1;
  std::string base;  // "s", "V", "A", "W", "ohm", "Hz", "div", "raw" (codes, decibels, percent)
};

/// The unit that `word` names ("ms", "[mV]", "Volts", "MSa/s" as "Hz"); nothing where it names none. Throws
/// Refusal for words that name two ("MV": milli or mega?).
std::optional<Unit> unit_of(std::string_view word, std::size_t line);

/// The unit in a column's title: "CH1 (mV)", "Time [us]", "Voltage/V", "Current in mA", "time_ms".
std::optional<Unit> unit_in_title(std::string_view title, std::size_t line);

/// `title` without its unit.
std::string name_in_title(std::string_view title, std::size_t line);

// ---- text (csv_text.cpp)

struct Cell {
  enum class Kind { empty, number, missing, unit, text };
  Kind kind = Kind::empty;
  double value = 0;       // as written; for `missing`: +-infinity where it is an over-range mark, else NaN
  double last_digit = 0;  // weight of the last printed digit
  bool pointed = false;   // has a decimal mark
  std::optional<Unit> unit;
  std::string_view text;  // trimmed, without quotes
};

struct Row {
  std::size_t line = 0;
  std::vector<Cell> cells;
};

struct Sheet {
  char separator = ',';
  char decimal = '.';
  std::vector<Row> header;  // rows above the data
  std::vector<Row> data;    // at least two
  std::vector<std::string> notes;
};

/// UTF-8 without byte-order mark, from whatever came. Throws Refusal for what is no text.
std::string decode(const std::string& text);

/// `text` must outlive the sheet. Throws Refusal.
Sheet split(const std::string& text);

Cell read_cell(std::string_view text, char decimal, std::size_t line);

std::string_view trim(std::string_view text);
std::string lower(std::string_view text);

// ---- header (csv_header.cpp)

struct Setting {
  std::size_t line = 0;
  double value = 0;
  std::optional<Unit> unit;
};

/// A setting that each channel has: "CH2 probe,10" goes by number, "Probe,10,1" by order.
struct ChannelSettings {
  std::vector<Setting> in_order;
  std::map<std::size_t, Setting> by_number;
};

/// What the lines above the data say.
struct Header {
  std::vector<std::string> titles;         // by column of the data, empty where none
  std::vector<std::optional<Unit>> units;  // by column
  std::size_t line = 0;                    // of the titles, or of the last header line
  std::optional<Setting> interval, rate, start, points;
  ChannelSettings volts_per_division, position, probe;
  std::optional<Unit> horizontal;
  std::vector<std::optional<Unit>> vertical;  // by channel, or one for all
  bool interpolated = false, alternating = false;
};

/// Number of the channel that a name or a key names ("CH2 volts/div"), from 1; 0: none.
std::size_t channel_number(const std::string& name);

Header read_header(const Sheet& sheet, std::size_t columns);

// ---- columns and time (csv.cpp, csv_time.cpp)

struct Column {
  std::string name;
  std::string base;                // empty: no unit stated
  std::vector<double> values;      // in `base`
  std::vector<double> last_digit;  // in `base`
  double lowest_over = 0, highest_over = 0;
  std::size_t over_low = 0, over_high = 0, missing = 0;
};

/// Fills capture.time from the time column (or from start and interval), mends what can be mended for
/// certain, and drops or turns rows of `columns` alike. `lines` holds the line of each row. Throws Refusal.
void place_in_time(Capture& capture, std::vector<Column>& columns, std::vector<std::size_t>& lines,
                   const Header& header, const CsvOptions& options);

// ---- defects (csv_defects.cpp)

/// Flat ends, quantisation, interpolated points, an unmarked change of unit (throws Refusal).
void find_defects(Capture& capture, const std::vector<std::size_t>& lines);

}  // namespace couplet::capture
