// SPDX-License-Identifier: MIT
#include "models/shape.h"

#include <algorithm>
#include <numbers>

namespace couplet {

std::vector<Key> shape_keys(const std::string& level, const std::string& unit) {
  const std::string zero = "0 " + unit;
  return {
      {"shape",
       "1",
       "what it does over time: steady, sine, pulses or table",
       "steady",
       0,
       0,
       false,
       Key::Type::word,
       {"steady", "sine", "pulses", "table"}},
      {level, unit, "steady value, amplitude of the sine, or upper level of the pulses", "-", -1e6, 1e6},
      {"rise", "s", "steady: time from zero to the full value", "0 s", 0, 1e6, false},
      {"delay", "s", "steady: time before it begins; pulses: shift in time", "0 s", 0, 1e6, false},
      {"offset", unit, "sine: mean value", zero, -1e6, 1e6},
      {"frequency", "Hz", "sine, pulses", "0 Hz", 0, 1e12},
      {"phase", "1", "sine: as a share of the period", "0", -1e3, 1e3, false},
      {"low", unit, "pulses: lower level", zero, -1e6, 1e6},
      {"duty", "1", "pulses: share of the period between the middles of the edges", "0.5", 0, 1, false},
      {"edge", "s", "pulses: time of each edge", "0 s", 0, 1e6, false},
      {"points",
       "s",
       "table: list of [time, value]; the value holds before the first and after the last",
       "-",
       -1e300,
       1e300,
       false,
       Key::Type::table,
       {},
       unit},
  };
}

std::string check_shape(const Values& v, const std::string& level) {
  const std::string& shape = v.words.at("shape");
  const bool sine = shape == "sine", pulses = shape == "pulses", table = shape == "table";
  if (!table && !v.has(level)) return "shape " + shape + " needs " + level + "; add it";
  // A key that the shape does not read would be dropped in silence.
  for (const auto& [key, read] : {std::pair<std::string, bool>{"rise", shape == "steady"},
                                  {"delay", shape == "steady" || pulses},
                                  {"offset", sine},
                                  {"frequency", sine || pulses},
                                  {"phase", sine},
                                  {"low", pulses},
                                  {"edge", pulses}}) {
    if (!read && v[key] != 0)
      return "shape " + shape + " does not read " + key + "; leave it out or choose another shape";
  }
  if (table && v.has(level))
    return "shape table does not read " + level + "; leave it out or choose another shape";
  if (!table && v.has("points"))
    return "shape " + shape + " does not read points; leave them out or choose shape table";
  if ((sine || pulses) && v["frequency"] <= 0) return "shape " + shape + " needs a frequency; add frequency";
  if (table) {
    if (!v.has("points") || v.tables.at("points").empty())
      return "shape table needs points = [[time, value], ...]";
    const auto& points = v.tables.at("points");
    const auto earlier = [](const auto& a, const auto& b) { return a.first < b.first; };
    if (!std::is_sorted(points.begin(), points.end(), earlier))
      return "the times of points go backwards; sort them";
  }
  if (pulses && v["edge"] * v["frequency"] > std::min(v["duty"], 1 - v["duty"]))
    return "edge is longer than the pulse or the pause; shorten it";
  return {};
}

Form shape_value(Sheet& sheet, const Values& v, const std::string& level) {
  const std::string& shape = v.words.at("shape");
  if (shape == "steady" && v["rise"] == 0 && v["delay"] == 0) return Form().add(v[level]);
  Waveform w;
  if (shape == "steady") {
    w.points = {{v["delay"], 0}, {v["delay"] + v["rise"], v[level]}};
  } else if (shape == "sine") {
    w.offset = v["offset"];
    w.amplitude = v[level];
    w.frequency = v["frequency"];
    w.phase = 2 * std::numbers::pi * v["phase"];
  } else if (shape == "pulses") {
    // From the start of a rising edge to that of the falling one is as long as from middle to middle.
    const double period = 1 / v["frequency"], edge = v["edge"], on = v["duty"] * period, start = v["delay"];
    w.points = {{start, v["low"]},
                {start + edge, v[level]},
                {start + on, v[level]},
                {start + on + edge, v["low"]},
                {start + period, v["low"]}};
    w.period = period;
  } else {
    for (auto [time, value] : v.tables.at("points")) w.points.push_back({time, value});
  }
  return Form().wave(sheet.waveform(std::move(w)));
}

}  // namespace couplet
