// SPDX-License-Identifier: MIT
// The time axis of a capture: from its own column, or from start and interval in the header; printed with too
// few digits, doubled, reversed, or in no order at all.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <numeric>

#include "engine/capture/csv_stages.h"

namespace couplet::capture {
namespace {

bool is_time_name(const std::string& name) {
  static constexpr std::array<std::string_view, 8> names{"time",  "t",   "x",       "zeit",
                                                         "temps", "tid", "seconds", "x-axis"};
  const std::string small = lower(name);
  return std::find(names.begin(), names.end(), small) != names.end();
}

bool is_index_name(const std::string& name) {
  static constexpr std::array<std::string_view, 10> names{"sample", "index", "n",        "no", "no.",
                                                          "nr",     "point", "sequence", "#",  "row"};
  const std::string small = lower(name);
  return std::find(names.begin(), names.end(), small) != names.end();
}

/// 0, 1, 2, ... or 1, 2, 3, ...
bool counts(const std::vector<double>& values) {
  if (values.front() != 0 && values.front() != 1) return false;
  for (std::size_t i = 1; i < values.size(); ++i) {
    if (values[i] != values[i - 1] + 1) return false;
  }
  return true;
}

/// Seconds of a header setting; a bare number counts in the unit that the file or the caller states for time.
double seconds(const Setting& setting, const Header& header, const CsvOptions& options, const char* what) {
  if (setting.unit && setting.unit->base == "s") return setting.value * setting.unit->factor;
  if (!setting.unit && header.horizontal) return setting.value * header.horizontal->factor;
  if (!setting.unit && !options.time_unit.empty()) {
    const auto unit = unit_of(options.time_unit, 0);
    if (unit && unit->base == "s") return setting.value * unit->factor;
  }
  throw Refusal(setting.line, fmt::format("the {} has no unit of time; state the time unit", what));
}

std::optional<double> header_interval(const Header& header, const CsvOptions& options) {
  if (header.interval) return seconds(*header.interval, header, options, "sample interval");
  if (!header.rate) return {};
  if (!header.rate->unit || header.rate->unit->base != "Hz") {
    throw Refusal(header.rate->line, "the sample rate has no unit; write it as MSa/s, kHz, ...");
  }
  return 1 / (header.rate->value * header.rate->unit->factor);
}

struct Grid {
  double start, interval, worst;  // worst: largest distance of a time from the grid, in units of the interval
  bool rounded;                   // every distance is within the last printed digit
};

/// Least-squares line through the times.
Grid fit_grid(const std::vector<double>& time, const std::vector<double>& last_digit) {
  const auto n = static_cast<double>(time.size());
  const double centre = (n - 1) / 2;
  double sum = 0;
  double slope = 0;
  for (std::size_t i = 0; i < time.size(); ++i) {
    sum += time[i] - time.front();
    slope += (static_cast<double>(i) - centre) * (time[i] - time.front());
  }
  const double interval = slope / (n * (n * n - 1) / 12);
  Grid grid{time.front() + sum / n - interval * centre, interval, 0, true};
  for (std::size_t i = 0; i < time.size(); ++i) {
    const double off = std::abs(time[i] - (grid.start + interval * static_cast<double>(i)));
    grid.worst = std::max(grid.worst, off / interval);
    // Half a digit of rounding, and a quarter for the line being fitted to rounded times.
    grid.rounded = grid.rounded && off <= 0.75 * last_digit[i] + 1e-9 * interval;
  }
  return grid;
}

/// "%g" drops zeros at the end: the digits that all times share count, not those of a round one.
std::vector<double> shared_digits(const std::vector<double>& time, const std::vector<double>& printed) {
  int digits = 1;
  for (std::size_t i = 0; i < time.size(); ++i) {
    if (time[i] == 0 || printed[i] <= 0) continue;
    digits =
        std::max(digits, static_cast<int>(std::floor(std::log10(std::abs(time[i]) / printed[i]) + 1e-9)) + 1);
  }
  std::vector<double> shared = printed;
  const double finest = *std::min_element(printed.begin(), printed.end());
  for (std::size_t i = 0; i < time.size(); ++i) {
    const double decade = time[i] == 0 ? finest : std::pow(10.0, std::floor(std::log10(std::abs(time[i]))));
    shared[i] = std::min(printed[i], std::max(finest, decade * std::pow(10.0, 1 - digits)));
  }
  return shared;
}

void keep_rows(Capture& capture, std::vector<Column>& columns, std::vector<std::size_t>& lines,
               const std::vector<std::size_t>& rows) {
  const auto pick = [&](auto& list) {
    auto kept = list;
    for (std::size_t i = 0; i < rows.size(); ++i) kept[i] = list[rows[i]];
    kept.resize(rows.size());
    list = std::move(kept);
  };
  pick(capture.time);
  pick(lines);
  for (Column& column : columns) {
    pick(column.values);
    pick(column.last_digit);
  }
}

bool same_value(double a, double b) { return a == b || (std::isnan(a) && std::isnan(b)); }

/// Rows that repeat the one before are dropped; two values at one time, or time running back, are refused.
void drop_doubles(Capture& capture, std::vector<Column>& columns, std::vector<std::size_t>& lines) {
  std::vector<std::size_t> rows{0};
  for (std::size_t i = 1; i < capture.time.size(); ++i) {
    const std::size_t before = rows.back();
    if (capture.time[i] > capture.time[before]) {
      rows.push_back(i);
      continue;
    }
    if (capture.time[i] < capture.time[before]) {
      throw Refusal(lines[i],
                    fmt::format("time runs back from {:.9g} s to {:.9g} s; did its unit change, or do two "
                                "records follow each other?",
                                capture.time[before], capture.time[i]));
    }
    for (const Column& column : columns) {
      if (same_value(column.values[i], column.values[before])) continue;
      throw Refusal(lines[i],
                    fmt::format("two different values of {} at {:.9g} s; export more digits of time",
                                column.name, capture.time[i]));
    }
  }
  if (rows.size() == capture.time.size()) return;
  capture.notes.push_back(
      fmt::format("{} rows repeat the row before and were left out", capture.time.size() - rows.size()));
  keep_rows(capture, columns, lines, rows);
}

void from_header(Capture& capture, std::size_t rows, const Header& header, const CsvOptions& options) {
  const auto interval = header_interval(header, options);
  if (!interval) {
    throw Refusal(header.line, "no time column and no sample interval in the header; add one of them");
  }
  if (!(*interval > 0)) throw Refusal(header.line, "the sample interval must be above zero");
  const double start = header.start ? seconds(*header.start, header, options, "start time") : 0;
  capture.time.resize(rows);
  for (std::size_t i = 0; i < rows; ++i) capture.time[i] = start + *interval * static_cast<double>(i);
  capture.notes.push_back(fmt::format("time from the header: start {:.9g} s, interval {:.9g} s{}", start,
                                      *interval, header.start ? "" : " (no start stated: counted from 0)"));
}

void from_column(Capture& capture, std::vector<Column>& columns, std::vector<std::size_t>& lines,
                 const Header& header, const CsvOptions& options) {
  Column axis = std::move(columns.front());
  columns.erase(columns.begin());
  if (axis.base.empty()) {
    const auto unit = header.horizontal ? header.horizontal : unit_of(options.time_unit, 0);
    if (!unit || unit->base != "s") {
      throw Refusal(header.line, "the time column has no unit; state the time unit");
    }
    for (double& value : axis.values) value *= unit->factor;
    for (double& value : axis.last_digit) value *= unit->factor;
  }
  for (std::size_t i = 0; i < axis.values.size(); ++i) {
    if (!std::isfinite(axis.values[i])) throw Refusal(lines[i], "a row without a time");
  }
  capture.time = axis.values;
  if (capture.time.front() > capture.time.back() &&
      std::is_sorted(capture.time.rbegin(), capture.time.rend())) {
    std::vector<std::size_t> rows(capture.time.size());
    std::iota(rows.rbegin(), rows.rend(), std::size_t{0});
    keep_rows(capture, columns, lines, rows);
    std::reverse(axis.last_digit.begin(), axis.last_digit.end());
    capture.notes.push_back("rows run back in time from first to last; turned round");
  }
  if (std::is_sorted(capture.time.begin(), capture.time.end()) && capture.time.size() > 2 &&
      capture.time.back() > capture.time.front()) {
    const Grid grid = fit_grid(capture.time, shared_digits(capture.time, axis.last_digit));
    if (grid.worst > 1e-3 && grid.rounded) {
      for (std::size_t i = 0; i < capture.time.size(); ++i) {
        capture.time[i] = grid.start + grid.interval * static_cast<double>(i);
      }
      capture.notes.push_back(
          fmt::format("time is printed with too few digits for its steps; even steps of {:.9g} s "
                      "fit all of it and were put in its place",
                      grid.interval));
    }
  }
  drop_doubles(capture, columns, lines);
}

/// A second column of time is dropped where it repeats the first.
void drop_second_axes(Capture& capture, std::vector<Column>& columns, const Header& header) {
  for (std::size_t i = 0; i < columns.size();) {
    if (columns[i].base != "s") {
      ++i;
      continue;
    }
    for (std::size_t row = 0; row < capture.time.size(); ++row) {
      if (std::abs(columns[i].values[row] - capture.time[row]) <= columns[i].last_digit[row] + 1e-15)
        continue;
      throw Refusal(header.line,
                    "channels have time columns that differ; keep one time column with its channels");
    }
    capture.notes.push_back("a second time column repeats the first and was left out");
    columns.erase(columns.begin() + static_cast<std::ptrdiff_t>(i));
  }
}

double median_step(const std::vector<double>& time) {
  std::vector<double> steps;
  for (std::size_t i = 1; i < time.size(); ++i) steps.push_back(time[i] - time[i - 1]);
  if (steps.empty()) return 0;
  const auto middle = steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2);
  std::nth_element(steps.begin(), middle, steps.end());
  return *middle;
}

void describe(Capture& capture) {
  const std::size_t n = capture.time.size();
  if (n < 2) throw Refusal(0, "fewer than two instants");
  capture.interval = (capture.time.back() - capture.time.front()) / static_cast<double>(n - 1);
  double shortest = capture.interval;
  double longest = capture.interval;
  double gap_at = 0;
  for (std::size_t i = 1; i < n; ++i) {
    const double step = capture.time[i] - capture.time[i - 1];
    shortest = std::min(shortest, step);
    if (step > longest) longest = step, gap_at = capture.time[i - 1];
  }
  capture.uniform = longest - shortest <= 0.01 * capture.interval;
  if (!capture.uniform) {
    capture.notes.push_back(
        fmt::format("samples are not evenly spaced: steps from {:.4g} s to {:.4g} s, the longest "
                    "at {:.6g} s",
                    shortest, longest, gap_at));
  }
}

/// A first column without title or unit that only grows may be time: it is where its steps are the header's
/// interval.
bool is_unnamed_axis(Column& first, const Header& header, const CsvOptions& options) {
  if (counts(first.values) || std::adjacent_find(first.values.begin(), first.values.end(),
                                                 std::greater_equal<>()) != first.values.end()) {
    return false;
  }
  const auto interval = header_interval(header, options);
  if (interval && std::abs(median_step(first.values) / *interval - 1) < 0.01) {
    first.base.assign(1, 's');
    return true;
  }
  if (interval)
    throw Refusal(header.line, "the first column grows like a time, but not by the header's interval");
  return true;
}

}  // namespace

void place_in_time(Capture& capture, std::vector<Column>& columns, std::vector<std::size_t>& lines,
                   const Header& header, const CsvOptions& options) {
  Column& first = columns.front();
  bool timed = first.base == "s" || (first.base.empty() && is_time_name(first.name));
  if (!timed && columns.size() > 1 && first.name.empty() && first.base.empty()) {
    timed = is_unnamed_axis(first, header, options);
  }
  const bool indexed = !timed && (is_index_name(first.name) ||
                                  (columns.size() > 1 && first.base.empty() && counts(first.values)));
  if (timed && first.base.empty() && counts(first.values) && (header.interval || header.rate)) {
    columns.erase(columns.begin());  // "x" that only counts
    from_header(capture, lines.size(), header, options);
  } else if (timed) {
    from_column(capture, columns, lines, header, options);
    const auto interval = header_interval(header, options);
    const double usual = median_step(capture.time);
    if (interval && std::abs(usual / *interval - 1) > 0.01) {
      throw Refusal(header.line,
                    fmt::format("the header says {:.6g} s between samples, the time column {:.6g} s; "
                                "one of their units is wrong",
                                *interval, usual));
    }
  } else if (indexed) {
    columns.erase(columns.begin());
    from_header(capture, lines.size(), header, options);
  } else if (header.interval || header.rate) {
    from_header(capture, lines.size(), header, options);
  } else {
    throw Refusal(header.line,
                  "no time column found: the first column names neither time nor a unit of time, and the "
                  "header holds no sample interval");
  }
  if (columns.empty()) throw Refusal(header.line, "no channel beside the time");
  drop_second_axes(capture, columns, header);
  describe(capture);
}

}  // namespace couplet::capture
