// SPDX-License-Identifier: MIT
// Oscilloscope captures as text -> channels in SI units. There is no standard for these files, so the reader
// finds out what it can (separator, decimal mark, header, units, time axis, defects), writes down in `notes`
// what it found, and refuses a file that could be read in two ways. It never guesses a unit or a factor.
#pragma once

#include <cstddef>
#include <map>
#include <string>
#include <vector>

namespace couplet::capture {

struct CsvOptions {
  std::string time_unit;  // "us": said by the caller where the file states none
  std::string unit;       // "V": likewise for every channel
  std::map<std::string, double>
      probe;  // true factor of the probe by channel name, "" for every voltage channel
};

struct Channel {
  std::string name;
  std::string unit;              // "V", "A", "W", "ohm", "Hz"
  std::vector<double> values;    // [unit]; NaN where the file has no value
  bool clipped_low = false;      // flat bottom: true values may lie below `low`
  bool clipped_high = false;     // flat top
  double low = 0, high = 0;      // smallest and largest value [unit]
  double step = 0;               // distance of quantised levels [unit]; 0: none seen
  std::size_t interpolated = 1;  // one row in so many is a sample, the others are computed from them
};

struct Capture {
  std::string file;
  std::vector<double> time;  // [s], strictly increasing
  bool uniform = false;
  double interval = 0;  // [s], mean distance of samples
  std::vector<Channel> channels;
  std::vector<std::string> notes;  // what was found out, each a sentence with its line where it has one
};

/// Either a capture or a refusal "FILE:LINE: what is wrong; what to do".
struct CsvReading {
  Capture capture;
  std::string refusal;  // empty: good
  explicit operator bool() const { return refusal.empty(); }
};

/// `text` is the whole file (UTF-8, UTF-16 with byte-order mark, or Latin-1); `file` is used in messages
/// only.
CsvReading read_csv(const std::string& text, const std::string& file, const CsvOptions& options = {});

/// Reads the file at `path`.
CsvReading read_csv_file(const std::string& path, const CsvOptions& options = {});

}  // namespace couplet::capture
