// SPDX-License-Identifier: MIT
#include "engine/capture/csv.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <fstream>
#include <iterator>
#include <limits>

#include "engine/capture/csv_stages.h"

namespace couplet::capture {
namespace {

/// Columns of the sheet that hold numbers, in the order of the file, with the index they have in the rows.
std::vector<std::size_t> number_columns(const Sheet& sheet) {
  std::size_t width = 0;
  for (const Row& row : sheet.data) width = std::max(width, row.cells.size());
  std::vector<std::size_t> columns;
  for (std::size_t column = 0; column < width; ++column) {
    bool numbers = false;
    bool words = false;
    for (const Row& row : sheet.data) {
      if (column >= row.cells.size()) continue;
      const Cell::Kind kind = row.cells[column].kind;
      numbers = numbers || kind == Cell::Kind::number || kind == Cell::Kind::missing;
      words = words || kind == Cell::Kind::unit;
      if (numbers && words) {
        throw Refusal(row.line,
                      fmt::format("column {} holds numbers in some rows and units in others", column + 1));
      }
    }
    if (numbers) columns.push_back(column);
  }
  return columns;
}

/// Unit of one cell: its own, or that of the unit column behind it.
std::optional<Unit> unit_in_row(const Row& row, std::size_t column) {
  if (row.cells[column].unit) return row.cells[column].unit;
  if (column + 1 < row.cells.size() && row.cells[column + 1].kind == Cell::Kind::unit)
    return row.cells[column + 1].unit;
  return {};
}

void count_missing(Column& column, const Cell& cell) {
  if (std::isinf(cell.value)) {
    ++(cell.value > 0 ? column.over_high : column.over_low);
  } else {
    ++column.missing;
  }
}

Column read_column(const Sheet& sheet, std::size_t index, const std::optional<Unit>& titled) {
  Column column;
  bool in_rows = false;
  bool in_title = false;
  for (const Row& row : sheet.data) {
    const bool present = index < row.cells.size();
    if (!present || row.cells[index].kind != Cell::Kind::number) {
      if (present && row.cells[index].kind == Cell::Kind::missing) {
        count_missing(column, row.cells[index]);
      } else {
        ++column.missing;
      }
      column.values.push_back(std::numeric_limits<double>::quiet_NaN());
      column.last_digit.push_back(0);
      continue;
    }
    const Cell& cell = row.cells[index];
    const auto own = unit_in_row(row, index);
    (own ? in_rows : in_title) = true;
    if (in_rows && in_title) {
      throw Refusal(row.line,
                    fmt::format("column {} states its unit in some rows and not in others", index + 1));
    }
    const Unit unit = own ? *own : titled.value_or(Unit{1, ""});
    if (column.base.empty()) column.base = unit.base;
    if (column.base != unit.base) {
      throw Refusal(row.line,
                    fmt::format("column {} changes from {} to {}", index + 1, column.base, unit.base));
    }
    column.values.push_back(cell.value * unit.factor);
    column.last_digit.push_back(cell.last_digit * unit.factor);
  }
  return column;
}

/// One of several channels: its number from 0 in the file, and its name.
struct Which {
  std::size_t index, of;
  std::string name;
};

/// The setting of one channel; nothing where the header states none. A list by order must be as long as the
/// file is wide, since oscilloscopes also list channels that they do not export.
const Setting* setting_for(const ChannelSettings& settings, const Which& channel, const char* what) {
  if (const auto named = settings.by_number.find(channel_number(channel.name));
      named != settings.by_number.end()) {
    return &named->second;
  }
  const auto& list = settings.in_order;
  if (list.empty()) return nullptr;
  if (list.size() == 1) return &list.front();
  if (list.size() == channel.of) return &list[channel.index];
  throw Refusal(list.front().line,
                fmt::format("{} for {} channels, but the file holds {}; keep those of the channels "
                            "in the file",
                            what, list.size(), channel.of));
}

void from_divisions(Column& column, const Header& header, const Which& channel) {
  const Setting* scale = setting_for(header.volts_per_division, channel, "volts per division");
  if (!scale || !scale->unit) {
    throw Refusal(header.line,
                  fmt::format("{} is in divisions and the header states no volts per division with a "
                              "unit; export in volts",
                              column.name));
  }
  const Setting* position = setting_for(header.position, channel, "vertical positions");
  if (position && position->value != 0) {
    throw Refusal(position->line,
                  "values in divisions with a vertical position other than zero: whether they contain "
                  "it is not said; export in volts");
  }
  const double factor = scale->value * scale->unit->factor;
  for (double& value : column.values) value *= factor;
  column.base = scale->unit->base;
}

void apply_probe(Capture& capture, Column& column, const Header& header, const Which& channel,
                 const CsvOptions& options) {
  const Setting* stated = setting_for(header.probe, channel, "probe factors");
  const double held = stated && stated->value > 0 ? stated->value : 1;
  auto said = options.probe.find(column.name);
  if (said == options.probe.end()) said = options.probe.find("");
  if (said == options.probe.end() || column.base != "V") {
    if (stated && held == 1 && column.base == "V") {
      capture.notes.push_back(
          fmt::format("line {}: {}: the oscilloscope was set to a probe factor of 1; with a 10:1 "
                      "probe all its volts are ten times too small",
                      stated->line, column.name));
    }
    return;
  }
  const double factor = said->second / held;
  for (double& value : column.values) value *= factor;
  capture.notes.push_back(fmt::format("{}: probe factor {} as given; the file {} {}, so volts times {}",
                                      column.name, said->second,
                                      stated ? "was written with" : "states none, taken as", held, factor));
}

/// Divisions to volts, units that nobody stated, probes.
void settle_unit(Capture& capture, Column& column, const Header& header, const Which& channel,
                 const CsvOptions& options) {
  if (column.base.empty()) {
    std::optional<Unit> unit;
    if (header.vertical.size() == 1) unit = header.vertical.front();
    if (header.vertical.size() == channel.of) unit = header.vertical[channel.index];
    if (!unit && !options.unit.empty()) unit = unit_of(options.unit, 0);
    if (!unit) {
      throw Refusal(header.line, fmt::format("{} has no unit; state the unit (volts? millivolts? divisions?)",
                                             column.name));
    }
    column.base = unit->base;
    for (double& value : column.values) value *= unit->factor;
  }
  if (column.base == "div") from_divisions(column, header, channel);
  if (column.base == "raw") {
    throw Refusal(header.line,
                  fmt::format("{} is in converter codes, decibels or percent; export in volts", column.name));
  }
  apply_probe(capture, column, header, channel, options);
}

std::vector<Column> read_columns(const Sheet& sheet, Header& header) {
  const std::vector<std::size_t> indices = number_columns(sheet);
  if (indices.empty()) throw Refusal(0, "no column of numbers");
  header = read_header(sheet, indices.back() + 1);
  std::vector<Column> columns;
  for (const std::size_t index : indices) {
    Column column = read_column(sheet, index, header.units[index]);
    column.name = header.titles[index];
    columns.push_back(std::move(column));
  }
  return columns;
}

void note_header(Capture& capture, const Header& header, const Sheet& sheet) {
  if (sheet.separator != ',' || sheet.decimal != '.') {
    capture.notes.push_back(fmt::format("cells parted by {}, decimal {}",
                                        sheet.separator == '\t'  ? "tabs"
                                        : sheet.separator == ';' ? "semicolons"
                                                                 : "commas",
                                        sheet.decimal == ',' ? "comma" : "point"));
  }
  if (header.interpolated) capture.notes.push_back("the header says that points were interpolated");
  if (header.alternating) {
    capture.notes.push_back("the header says AC coupling: the offset is lost and slow parts droop");
  }
  if (header.points && header.points->value != static_cast<double>(sheet.data.size())) {
    capture.notes.push_back(fmt::format("line {}: the header announces {} points, the file holds {}",
                                        header.points->line, header.points->value, sheet.data.size()));
  }
}

void fill(Capture& capture, const std::string& text, const CsvOptions& options) {
  const Sheet sheet = split(text);
  capture.notes = sheet.notes;
  Header header;
  std::vector<Column> columns = read_columns(sheet, header);
  note_header(capture, header, sheet);
  std::vector<std::size_t> lines;
  for (const Row& row : sheet.data) lines.push_back(row.line);
  place_in_time(capture, columns, lines, header, options);
  for (std::size_t i = 0; i < columns.size(); ++i) {
    Column& column = columns[i];
    if (column.name.empty()) column.name = fmt::format("channel {}", i + 1);
    settle_unit(capture, column, header, {i, columns.size(), column.name}, options);
    if (column.missing > 0) {
      capture.notes.push_back(fmt::format("{}: {} rows without a value", column.name, column.missing));
    }
    if (column.over_high + column.over_low > 0) {
      capture.notes.push_back(fmt::format("{}: {} rows over range, left without a value", column.name,
                                          column.over_high + column.over_low));
    }
    Channel channel{column.name, column.base, std::move(column.values), column.over_low > 0,
                    column.over_high > 0};
    capture.channels.push_back(std::move(channel));
  }
  find_defects(capture, lines);
}

}  // namespace

CsvReading read_csv(const std::string& text, const std::string& file, const CsvOptions& options) {
  CsvReading reading;
  reading.capture.file = file;
  try {
    fill(reading.capture, decode(text), options);
  } catch (const Refusal& refusal) {
    reading.refusal = refusal.line > 0 ? fmt::format("{}:{}: {}", file, refusal.line, refusal.what())
                                       : fmt::format("{}: {}", file, refusal.what());
    reading.capture.channels.clear();
    reading.capture.time.clear();
  }
  return reading;
}

CsvReading read_csv_file(const std::string& path, const CsvOptions& options) {
  std::ifstream stream(path, std::ios::binary);
  if (!stream) {
    CsvReading reading;
    reading.refusal = path + ": cannot be read; is the name right?";
    return reading;
  }
  const std::string text{std::istreambuf_iterator<char>(stream), {}};
  return read_csv(text, path, options);
}

}  // namespace couplet::capture
