// SPDX-License-Identifier: MIT
// The lines above the data: titles, units, and settings such as the sample interval or the volts per
// division.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <charconv>

#include "engine/capture/csv_stages.h"

namespace couplet::capture {
namespace {

using Words = std::initializer_list<std::string_view>;

/// Letters, digits and slashes of a key, in lower case, without its unit in brackets.
std::string plain_key(std::string_view key) {
  std::string plain;
  for (const char c : lower(key.substr(0, key.find_first_of("([")))) {
    if (std::isalnum(static_cast<unsigned char>(c)) || c == '/') plain += c;
  }
  return plain;
}

bool contains(const std::string& key, Words words) {
  return std::any_of(words.begin(), words.end(),
                     [&](std::string_view word) { return key.find(word) != std::string::npos; });
}

bool is(const std::string& key, Words words) {
  return std::find(words.begin(), words.end(), key) != words.end();
}

bool is_interval(const std::string& key) {
  return contains(key, {"sampleinterval", "samplinginterval", "sampleperiod", "samplingperiod", "increment",
                        "timestep"}) ||
         is(key, {"dt", "deltat", "xstep", "tick"});
}
bool is_rate(const std::string& key) {
  return contains(key, {"samplerate", "samplingrate", "samplefrequency", "samplingfrequency"});
}
bool is_start(const std::string& key) {
  return is(key, {"start", "starttime", "xstart", "tstart", "t0", "xorigin", "timeorigin", "firsttime"});
}
bool is_points(const std::string& key) {
  return is(key, {"recordlength", "points", "numberofpoints", "memorylength", "samples", "datapoints",
                  "numberofsamples"});
}
bool is_division(const std::string& key) {
  return contains(key, {"volts/div", "volt/div", "v/div", "verticalscale", "voltsperdiv", "perdivision",
                        "amps/div", "verticalsensitivity"}) &&
         !contains(key, {"time", "horizontal", "s/divs", "sec/div"});
}
bool is_position(const std::string& key) {
  return contains(key, {"verticalposition", "verticaloffset", "traceposition"});
}
bool is_probe(const std::string& key) { return contains(key, {"probe", "attenuation"}); }
bool is_horizontal_unit(const std::string& key) {
  return is(key, {"horizontalunits", "horizontalunit", "timeunit", "timeunits", "xunit", "xunits"});
}
bool is_vertical_unit(const std::string& key) {
  return is(key, {"verticalunits", "verticalunit", "yunit", "yunits", "unit", "units"});
}
bool is_known(const std::string& key) {
  return is_interval(key) || is_rate(key) || is_start(key) || is_points(key) || is_division(key) ||
         is_position(key) || is_probe(key) || is_horizontal_unit(key) || is_vertical_unit(key) ||
         contains(key, {"interpolation", "coupling"});
}

/// "0.5", "500 mV", "500mV/div", "10X", "1:10" as a setting; nothing where it is no number.
std::optional<Setting> setting_of(std::string_view text, char decimal, std::size_t line) {
  std::string plain(trim(text));
  const std::size_t division = lower(plain).find("/div");
  if (division != std::string::npos) plain.resize(division);
  if (plain.starts_with("1:")) plain.erase(0, 2);
  if (plain.ends_with(":1")) plain.resize(plain.size() - 2);
  if (plain.size() > 1 && (plain.back() == 'X' || plain.back() == 'x')) plain.pop_back();
  if (plain.size() > 1 && (plain.front() == 'X' || plain.front() == 'x')) plain.erase(0, 1);
  const Cell cell = read_cell(plain, decimal, line);
  if (cell.kind != Cell::Kind::number) return {};
  return Setting{line, cell.value, cell.unit};
}

/// One header row as key and values: "Key,value,value", "Key: value", "# Key = value".
struct KeyValues {
  std::string title;
  std::string key;
  std::vector<std::string_view> values;
};

KeyValues key_values(const Row& row) {
  KeyValues result;
  if (row.cells.empty()) return result;
  std::string_view head = row.cells.front().text;
  while (!head.empty() && (head.front() == '#' || head.front() == '%' || head.front() == ' '))
    head.remove_prefix(1);
  const std::size_t mark = head.find_first_of(":=");
  if (mark != std::string_view::npos) {
    const std::string_view value = trim(head.substr(mark + 1));
    if (!value.empty()) result.values.push_back(value);
    head = head.substr(0, mark);
  }
  for (std::size_t i = 1; i < row.cells.size(); ++i) {
    if (row.cells[i].kind != Cell::Kind::empty) result.values.push_back(row.cells[i].text);
  }
  result.title = trim(head);
  result.key = plain_key(result.title);
  return result;
}

/// Puts the values of one row where they belong; a unit in the title or in a cell of its own holds for all.
void store(ChannelSettings& settings, const KeyValues& row, char decimal, std::size_t line) {
  std::vector<Setting> found;
  std::optional<Unit> shared = unit_in_title(row.title, line);
  if (!shared && contains(row.key, {"volts/div", "volt/div", "v/div", "voltsperdiv"})) shared = Unit{1, "V"};
  if (!shared && contains(row.key, {"amps/div"})) shared = Unit{1, "A"};
  if (shared && shared->base == "div") shared.reset();
  for (const std::string_view value : row.values) {
    if (const auto setting = setting_of(value, decimal, line)) {
      found.push_back(*setting);
    } else if (const auto unit = unit_of(value, line)) {
      shared = unit;
    }
  }
  for (Setting& setting : found) {
    if (!setting.unit) setting.unit = shared;
  }
  const std::size_t channel = channel_number(row.title);
  if (channel == 0 && !found.empty()) settings.in_order = found;
  if (channel > 0 && found.size() == 1) settings.by_number[channel] = found.front();
}

void read_settings(Header& header, const Row& row, char decimal) {
  const KeyValues pair = key_values(row);
  if (pair.values.empty() || !is_known(pair.key)) return;
  const auto single = [&](std::optional<Setting>& into) {
    ChannelSettings list;
    store(list, pair, decimal, row.line);
    if (!list.in_order.empty()) into = list.in_order.back();
  };
  const std::string value = lower(pair.values.front());
  if (is_division(pair.key)) {
    store(header.volts_per_division, pair, decimal, row.line);
  } else if (is_position(pair.key)) {
    store(header.position, pair, decimal, row.line);
  } else if (is_probe(pair.key)) {
    store(header.probe, pair, decimal, row.line);
  } else if (is_interval(pair.key)) {
    single(header.interval);
  } else if (is_rate(pair.key)) {
    single(header.rate);
  } else if (is_start(pair.key)) {
    single(header.start);
  } else if (is_points(pair.key)) {
    single(header.points);
  } else if (is_horizontal_unit(pair.key)) {
    header.horizontal = unit_of(value, row.line);
  } else if (is_vertical_unit(pair.key)) {
    for (const std::string_view word : pair.values) header.vertical.push_back(unit_of(word, row.line));
  } else if (contains(pair.key, {"interpolation"})) {
    header.interpolated = !(value == "off" || value == "none" || value == "no" || value == "0");
  } else if (contains(pair.key, {"coupling"})) {
    header.alternating = value == "ac";
  }
}

/// Every filled cell is a unit word.
bool is_unit_row(const Row& row) {
  std::size_t units = 0;
  for (const Cell& cell : row.cells) {
    if (cell.kind == Cell::Kind::empty) continue;
    if (cell.kind != Cell::Kind::unit) return false;
    ++units;
  }
  return units > 0;
}

/// Start and increment as titles of their own columns, with the numbers in the row below.
void read_columns_of_settings(Header& header, const Row& titles, const Row& below) {
  for (std::size_t i = 0; i < std::min(titles.cells.size(), below.cells.size()); ++i) {
    if (below.cells[i].kind != Cell::Kind::number) continue;
    const std::string key = plain_key(titles.cells[i].text);
    Setting setting{below.line, below.cells[i].value, below.cells[i].unit};
    if (!setting.unit) setting.unit = unit_in_title(titles.cells[i].text, titles.line);
    if (is_interval(key)) header.interval = setting;
    if (is_start(key)) header.start = setting;
  }
}

void set_unit(Header& header, std::size_t column, const std::optional<Unit>& unit, std::size_t line) {
  if (!unit || column >= header.units.size()) return;
  std::optional<Unit>& held = header.units[column];
  if (held && (held->base != unit->base || held->factor != unit->factor)) {
    throw Refusal(line, fmt::format("column {}: title and unit line name different units", column + 1));
  }
  held = unit;
}

void read_titles(Header& header, const Row& row) {
  header.line = row.line;
  const bool units = is_unit_row(row);
  for (std::size_t i = 0; i < std::min(row.cells.size(), header.titles.size()); ++i) {
    std::string_view title = row.cells[i].text;
    while (!title.empty() && (title.front() == '#' || title.front() == '%' || title.front() == ' ')) {
      title.remove_prefix(1);
    }
    if (title.empty()) continue;
    // A lone letter in a row of titles is a name ("A" and "B" are channels), unless the whole row is units.
    const bool lone = title.size() == 1 && !units;
    if (!lone) set_unit(header, i, unit_in_title(title, row.line), row.line);
    if (!units) header.titles[i] = lone ? std::string(title) : name_in_title(title, row.line);
  }
}

bool is_title_row(const Row& row, std::size_t columns) {
  std::size_t filled = 0;
  for (const Cell& cell : row.cells) {
    if (cell.kind == Cell::Kind::number) return false;
    if (cell.kind != Cell::Kind::empty) ++filled;
  }
  if (filled == 0 || filled < std::min<std::size_t>(columns, 2)) return false;
  const KeyValues pair = key_values(row);
  return !(is_known(pair.key) && filled <= 2 && columns <= 2 && !is_start(pair.key)) &&
         !(is_known(pair.key) && row.cells.size() > 1 && unit_of(row.cells[1].text, row.line));
}

}  // namespace

std::size_t channel_number(const std::string& name) {
  std::string plain;
  for (const char c : lower(name)) {
    if (std::isalnum(static_cast<unsigned char>(c))) plain += c;
  }
  for (const std::string_view word : {"channel", "chan", "ch"}) {
    const std::size_t at = plain.find(word);
    if (at == std::string::npos) continue;
    std::size_t number = 0;
    std::from_chars(plain.data() + at + word.size(), plain.data() + plain.size(), number);
    if (number > 0 && number < 100) return number;
  }
  return 0;
}

Header read_header(const Sheet& sheet, std::size_t columns) {
  Header header;
  header.titles.resize(columns);
  header.units.resize(columns);
  for (const Row& row : sheet.header) read_settings(header, row, sheet.decimal);

  // Titles and units stand right above the data: unit row, title row, in either order, or one of them.
  std::size_t last = 0;
  while (last < sheet.header.size() && sheet.header[last].line < sheet.data.front().line) ++last;
  if (last == 0) return header;
  const Row& lowest = sheet.header[last - 1];
  header.line = lowest.line;
  const Row* above = last > 1 ? &sheet.header[last - 2] : nullptr;
  if (above) read_columns_of_settings(header, *above, lowest);
  const bool mixed = !lowest.cells.empty() && lowest.cells.front().kind != Cell::Kind::number &&
                     std::any_of(lowest.cells.begin(), lowest.cells.end(),
                                 [](const Cell& cell) { return cell.kind == Cell::Kind::number; }) &&
                     !is_known(key_values(lowest).key);
  if (mixed && above && is_title_row(*above, columns)) {  // "Sequence,Volt,-1.0e-3,1e-6"
    read_titles(header, *above);
    for (std::size_t i = 0; i < std::min(columns, lowest.cells.size()); ++i) {
      if (lowest.cells[i].kind == Cell::Kind::unit) set_unit(header, i, lowest.cells[i].unit, lowest.line);
    }
    return header;
  }
  if (!is_title_row(lowest, columns)) return header;
  const bool two = above && is_title_row(*above, columns) && (is_unit_row(lowest) || is_unit_row(*above));
  if (two) read_titles(header, *above);
  read_titles(header, lowest);
  return header;
}

}  // namespace couplet::capture
