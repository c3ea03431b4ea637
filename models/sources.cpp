// SPDX-License-Identifier: MIT
// Supply and current source: steady (with a rise), sine, pulses, or a table over time.
#include "models/kinds.h"
#include "models/pieces.h"

namespace couplet {
namespace {

std::vector<Key> shape_keys(const std::string& level, const std::string& unit, const std::string& high) {
  return {
      {"shape",
       "1",
       "steady, sine, pulses or table",
       "steady",
       0,
       0,
       false,
       Key::Type::word,
       {"steady", "sine", "pulses", "table"}},
      {level, unit, "steady value, amplitude of the sine, or upper level of the pulses", "0 " + unit, -1e6,
       1e6},
      {"rise", "s", "steady: time from zero to the full value", "0 s", 0, 1e6, false},
      {"delay", "s", "steady, pulses: time before it begins", "0 s", 0, 1e6, false},
      {"offset", unit, "sine: mean value", "0 " + unit, -1e6, 1e6},
      {"frequency", "Hz", "sine, pulses", "0 Hz", 0, 1e12},
      {"phase", "1", "sine: as a share of the period", "0", -1e3, 1e3, false},
      {high, unit, "pulses: lower level", "0 " + unit, -1e6, 1e6},
      {"duty", "1", "pulses: share of the period at the upper level", "0.5", 0, 1, false},
      {"edge", "s", "pulses: time of each edge", "0 s", 0, 1e6, false},
      {"points", "s", "table: list of [time, value]", "-", -1e300, 1e300, false, Key::Type::table, {}, unit},
  };
}

std::string check_shape(const Values& v) {
  const std::string& shape = v.words.at("shape");
  if ((shape == "sine" || shape == "pulses") && v["frequency"] <= 0)
    return "shape " + shape + " needs a frequency; add frequency";
  if (shape == "table" && (!v.tables.count("points") || v.tables.at("points").empty()))
    return "shape table needs points = [[time, value], ...]";
  if (shape == "table") {
    double before = -1e300;
    for (auto [t, x] : v.tables.at("points")) {
      if (t < before) return "the times of points go backwards; sort them";
      before = t;
    }
  }
  if (shape == "pulses" && v["edge"] * v["frequency"] > 0.5 * std::min(v["duty"], 1 - v["duty"]) + 0.5)
    return "edge is longer than the pulse; shorten it";
  return {};
}

/// The value over time as a form: a constant where it never changes, otherwise a waveform.
Form value_of(Sheet& sheet, const Values& v, const std::string& level, const std::string& low) {
  const std::string& shape = v.words.at("shape");
  if (shape == "steady" && v["rise"] == 0 && v["delay"] == 0) return Form().add(v[level]);
  Waveform w;
  if (shape == "steady") {
    w.points = {{v["delay"], 0}, {v["delay"] + v["rise"], v[level]}};
  } else if (shape == "sine") {
    w.offset = v["offset"];
    w.amplitude = v[level];
    w.frequency = v["frequency"];
    w.phase = 2 * 3.14159265358979323846 * v["phase"];
  } else if (shape == "pulses") {
    const double period = 1 / v["frequency"], edge = v["edge"], on = v["duty"] * period, start = v["delay"];
    w.points = {{start, v[low]},
                {start + edge, v[level]},
                {start + on, v[level]},
                {start + on + edge, v[low]},
                {start + period, v[low]}};
    w.period = period;
  } else {
    for (auto [t, x] : v.tables.at("points")) w.points.push_back({t, x});
  }
  return Form().wave(sheet.waveform(std::move(w)));
}

}  // namespace

const PartKind supply_kind = {
    "supply",
    "a voltage source with series resistance, and inductance and current limit where given",
    {{"across", "positive and negative node"}},
    joined(shape_keys("voltage", "V", "low"),
           {{"resistance", "ohm", "series resistance", "10 mohm", 1e-9, 1e9},
            {"inductance", "H", "series inductance; 0: none", "0 H", 0, 1e3},
            {"current_limit", "A", "largest current it delivers", "-", 1e-12, 1e9}}),
    two_terminal_ratings(),
    "kind = \"supply\"\nacross = [\"vin\", \"gnd\"]\nvoltage = \"12 V\"\nresistance = \"50 mohm\"\nrise = "
    "\"200 us\"\ncurrent_limit = \"3 A\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "supply", plus, minus, Role::source);
      const Form value = value_of(sheet, v, "voltage", "low");
      const double g = 1 / v["resistance"];
      Node top = plus;
      if (v["inductance"] > 0) {
        top = sheet.inner(part, "inside");
        sheet.coil(part, top, plus, v["inductance"], 0, 0);
      }
      Branch& b = sheet.branch(part, name, top, minus);
      b.has_emf = true;
      b.emf = value;
      Form normal;
      normal.volt(top, minus, g).plus(value, -g);
      if (v.has("current_limit")) {
        Condition free;  // current drawn below the limit
        free.form = normal;
        free.form.add(v["current_limit"]);
        b.conditions = {free};
        b.cells = {{"limits", 1, 0, Form().add(-v["current_limit"])}, {"supplies", 1, 1, normal}};
      } else {
        b.cells = {{"supplies", 0, 0, normal}};
      }
    },
    check_shape};

const PartKind current_source_kind = {
    "current_source",
    "a current source with a parallel resistance",
    {{"across", "current leaves at the first node"}},
    joined(shape_keys("current", "A", "low"),
           {{"resistance", "ohm", "parallel resistance", "1 Mohm", 1e-6, 1e15}}),
    two_terminal_ratings(),
    "kind = \"current_source\"\nacross = [\"feed\", \"gnd\"]\ncurrent = \"2 A\"\nshape = \"sine\"\nfrequency "
    "= \"140 kHz\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "current_source", plus, minus, Role::source);
      const Form value = value_of(sheet, v, "current", "low");
      Branch& b = sheet.branch(part, name, plus, minus);
      b.cells = {{"supplies", 0, 0, Form().plus(value, -1)}};
      sheet.resistor(part, plus, minus, v["resistance"]);
    },
    check_shape};

}  // namespace couplet
