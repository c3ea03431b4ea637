// SPDX-License-Identifier: MIT
#include "engine/netlist/coil_file.h"

#include <fmt/format.h>
#include <toml++/toml.h>

#include <algorithm>
#include <cmath>
#include <fstream>
#include <iterator>
#include <limits>
#include <map>

#include "engine/netlist/complaints.h"
#include "engine/netlist/sha256.h"
#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

/// One key that holds a quantity, and where its value goes.
struct Field {
  std::string name, unit;
  double* target;
  double low = 0, high = std::numeric_limits<double>::infinity();  // allowed, ends included
};

Place place_of(const toml::node& node) {
  return {static_cast<int>(node.source().begin.line), static_cast<int>(node.source().begin.column)};
}

class CoilFileReader {
 public:
  CoilFileReader(CoilFile& made, Complaints& complaints) : made_(made), complaints_(complaints) {}

  void read(const toml::table& root) {
    only(root,
         {"title", "frequency", "temperature", "first", "second", "place", "behind_first", "behind_second",
          "map", "field", "ladder"},
         "the coil file");
    made_.title = word(root, "title", {}, "");
    fields(root, "the coil file",
           {{"frequency", "Hz", &made_.frequency}, {"temperature", "degC", &made_.temperature, -200, 300}});
    if (const auto* first = sub(root, "first"))
      read_winding(*first, "first", made_.first);
    else
      complain({}, "there is no coil; add a table [first] with shape, turns, conductor and sizes");
    if (const auto* second = sub(root, "second")) read_winding(*second, "second", made_.second.emplace());
    if (const auto* place = sub(root, "place")) read_place(*place);
    for (const auto& [name, plane] : {std::pair{"behind_first", &made_.sheets.behind_first},
                                      {"behind_second", &made_.sheets.behind_second}})
      if (const auto* table = sub(root, name)) read_sheet(*table, name, plane->emplace());
    if (const auto* map = sub(root, "map")) read_map(*map);
    if (const auto* field = sub(root, "field")) read_field(*field);
    if (const auto* ladder = sub(root, "ladder")) read_ladder(*ladder);
    if (!made_.second)
      for (const char* name : {"place", "behind_second", "map"})
        if (const auto* node = root.get(name))
          complain(place_of(*node),
                   fmt::format("[{}] needs a second coil; add [second] or leave it out", name));
  }

 private:
  void complain(Place place, const std::string& what) {
    ++count_;
    complaints_.add(place, what);
  }

  void only(const toml::table& table, const std::vector<std::string>& allowed, const std::string& where) {
    for (auto&& [key, node] : table) {
      const std::string name(key.str());
      const auto& at = key.source().begin;
      if (std::find(allowed.begin(), allowed.end(), name) == allowed.end())
        complain(
            {static_cast<int>(at.line), static_cast<int>(at.column)},
            fmt::format("unknown key \"{}\" in {}{}", name.substr(0, 64), where, nearest(name, allowed)));
    }
  }

  const toml::table* sub(const toml::table& root, const std::string& name) {
    const auto* node = root.get(name);
    if (!node) return nullptr;
    if (!node->is_table())
      complain(place_of(*node), fmt::format("{} must be a table; write [{}]", name, name));
    return node->as_table();
  }

  /// A text; one of `words` where there are any.
  std::string word(const toml::table& table, const std::string& key, const std::vector<std::string>& words,
                   const std::string& fallback) {
    const auto* node = table.get(key);
    if (!node) return fallback;
    const auto value = node->value<std::string>();
    if (!node->is_string() || !value) {
      complain(place_of(*node), fmt::format("{} must be a text in quotes", key));
      return fallback;
    }
    if (words.empty() || std::find(words.begin(), words.end(), *value) != words.end()) return *value;
    complain(place_of(*node),
             fmt::format("{} cannot be \"{}\"{}", key, value->substr(0, 64), nearest(*value, words)));
    return fallback;
  }

  double quantity(const toml::node& node, const std::string& unit, const std::string& what) {
    std::string problem;
    if (node.is_string()) {
      std::string text = *node.value<std::string>();
      // "deg" is what drawings write; the units database calls it degree.
      if (unit == "rad" && text.size() > 3 && text.compare(text.size() - 3, 3, "deg") == 0) text += "ree";
      const ReadQuantity read = read_quantity(text, unit);
      if (read.problem.empty()) return read.value;
      problem = read.problem;
    } else if (node.is_number() && unit == "1") {
      return *node.value<double>();
    } else {
      problem = unit == "1"
                    ? "must be a number"
                    : fmt::format("must be a text with a unit, like \"10 {}\"", unit == "m" ? "mm" : unit);
    }
    complain(place_of(node), fmt::format("{}: {}", what, problem));
    return std::numeric_limits<double>::quiet_NaN();
  }

  void fields(const toml::table& table, const std::string& where, const std::vector<Field>& list) {
    for (const Field& f : list) {
      const auto* node = table.get(f.name);
      if (!node) continue;
      const std::string what = fmt::format("{} of {}", f.name, where);
      const double value = quantity(*node, f.unit, what);
      if (!std::isfinite(value)) continue;
      *f.target = value;
      if (value < f.low || value > f.high)
        complain(place_of(*node),
                 fmt::format("{} is {}; it must {}", what, print_quantity(value, f.unit),
                             std::isinf(f.high)
                                 ? fmt::format("be at least {}", print_quantity(f.low, f.unit))
                                 : fmt::format("lie between {} and {}", print_quantity(f.low, f.unit),
                                               print_quantity(f.high, f.unit))));
    }
  }

  std::vector<std::string> names(const std::vector<Field>& list, std::vector<std::string> others = {}) {
    for (const Field& f : list) others.push_back(f.name);
    return others;
  }

  void read_winding(const toml::table& table, const std::string& which, coil::Winding& w) {
    using coil::Conductor;
    using coil::Shape;
    double layers = 1, strands = 1;
    const std::vector<Field> list = {{"turns", "1", &w.turns},
                                     {"outer_diameter", "m", &w.outer_diameter},
                                     {"inner_diameter", "m", &w.inner_diameter},
                                     {"outer_length", "m", &w.outer_length},
                                     {"outer_width", "m", &w.outer_width},
                                     {"inner_length", "m", &w.inner_length},
                                     {"corner_radius", "m", &w.corner_radius},
                                     {"length", "m", &w.length},
                                     {"pitch", "m", &w.pitch},
                                     {"layers", "1", &layers, 1, 1000},
                                     {"layer_pitch", "m", &w.layer_pitch},
                                     {"diameter", "m", &w.conductor.diameter},
                                     {"strands", "1", &strands, 1, 1e5},
                                     {"bundle_diameter", "m", &w.conductor.bundle_diameter},
                                     {"width", "m", &w.conductor.width},
                                     {"thickness", "m", &w.conductor.thickness}};
    only(table, names(list, {"shape", "conductor"}), which);
    static const std::map<std::string, Shape> shapes = {{"flat_round", Shape::flat_round},
                                                        {"flat_rectangular", Shape::flat_rectangular},
                                                        {"solenoid", Shape::solenoid},
                                                        {"multilayer", Shape::multilayer}};
    static const std::map<std::string, Conductor::Kind> kinds = {
        {"wire", Conductor::Kind::wire}, {"litz", Conductor::Kind::litz}, {"trace", Conductor::Kind::trace}};
    w.shape = shapes.at(
        word(table, "shape", {"flat_round", "flat_rectangular", "solenoid", "multilayer"}, "flat_round"));
    w.conductor.kind = kinds.at(word(table, "conductor", {"wire", "litz", "trace"}, "wire"));
    const int before = count_;
    fields(table, which, list);
    for (const auto& [name, value] : {std::pair{"layers", layers}, {"strands", strands}})
      if (value != std::floor(value))
        complain(place_of(*table.get(name)), fmt::format("{} of {} must be a whole number", name, which));
    w.layers = static_cast<int>(layers), w.conductor.strands = static_cast<int>(strands);
    if (count_ > before) return;  // what follows from wrong values would only confuse
    for (const coil::Problem& p : coil::problems(w)) {
      const auto* node = table.get(p.key);
      complain(place_of(node ? *node : table), fmt::format("{} of {}: {}", p.key, which, p.text));
    }
  }

  void read_place(const toml::table& table) {
    coil::Placement& p = made_.place;
    const double endless = std::numeric_limits<double>::infinity();
    const std::vector<Field> list = {{"gap", "m", &p.gap, -1, endless},
                                     {"shift", "m", &p.shift, -10, 10},
                                     {"shift_across", "m", &p.shift_across, -10, 10},
                                     {"tilt", "rad", &p.tilt, -coil::pi, coil::pi}};
    only(table, names(list), "place");
    fields(table, "place", list);
  }

  void read_sheet(const toml::table& table, const std::string& which, coil::Plane& plane) {
    const std::vector<Field> list = {{"permeability", "1", &plane.permeability, 1},
                                     {"distance", "m", &plane.distance},
                                     {"thickness", "m", &plane.thickness},
                                     {"reach", "m", &plane.reach}};
    only(table, names(list, {"material"}), which);
    fields(table, which, list);
    plane.conducting = word(table, "material", {"ferrite", "conductor"}, "ferrite") == "conductor";
    if (!table.get("material"))
      complain(place_of(table), fmt::format("{} has no material; write \"ferrite\" or \"conductor\"", which));
    if (!plane.conducting && !table.get("permeability"))
      complain(place_of(table),
               fmt::format("{} has no permeability; add the relative permeability at the working frequency",
                           which));
  }

  /// A list of quantities, or { from, to, points }.
  std::vector<double> series(const toml::table& table, const std::string& key, const std::string& unit) {
    const auto* node = table.get(key);
    std::vector<double> list;
    if (!node) return list;
    if (const auto* span = node->as_table()) {
      double from = 0, to = 0, points = 0;
      only(*span, {"from", "to", "points"}, key);
      fields(*span, key,
             {{"from", unit, &from, -10}, {"to", unit, &to, -10}, {"points", "1", &points, 2, 1000}});
      if (points < 2 || !(to > from))
        complain(place_of(*node),
                 fmt::format("{} must run upward from one value to another in 2 points or more", key));
      for (int i = 0; i < points && points >= 2; ++i)
        list.push_back(from + (to - from) * i / (std::floor(points) - 1));
    } else if (const auto* array = node->as_array()) {
      for (const auto& item : *array) list.push_back(quantity(item, unit, key));
      std::sort(list.begin(), list.end());
    } else {
      complain(place_of(*node),
               fmt::format("{} must be a list like [\"1 mm\", \"2 mm\"], or {{ from, to, points }}", key));
    }
    return list;
  }

  void read_map(const toml::table& table) {
    only(table, {"gaps", "shifts"}, "map");
    made_.gaps = series(table, "gaps", "m"), made_.shifts = series(table, "shifts", "m");
    if (made_.gaps.empty())
      complain(place_of(table), "map has no gaps; add gaps = [\"1 mm\", \"2 mm\"] or { from, to, points }");
    if (made_.shifts.empty()) made_.shifts = {made_.place.shift};
  }

  void read_field(const toml::table& table) {
    FieldRequest& f = made_.field.emplace();
    const std::vector<Field> list = {{"first_current", "A", &f.first_current},
                                     {"second_current", "A", &f.second_current},
                                     {"phase", "rad", &f.phase, -100, 100}};
    only(table, names(list, {"distances"}), "field");
    fields(table, "field", list);
    f.distances = series(table, "distances", "m");
    if (!(made_.frequency >= 1) || made_.frequency > 10e6)
      complain(place_of(table), "the field needs frequency, between 1 Hz and 10 MHz, at the top of the file");
  }

  void read_ladder(const toml::table& table) {
    LadderRequest& l = made_.ladder.emplace();
    const std::vector<Field> list = {{"low", "Hz", &l.low, 1e-3},
                                     {"high", "Hz", &l.high, 1e-3},
                                     {"deviation", "1", &l.deviation, 1e-9, 1}};
    only(table, names(list), "ladder");
    fields(table, "ladder", list);
    if (!(l.low > 0) || !(l.high > l.low))
      complain(place_of(table), "ladder needs a band: low and high, low below high");
  }

  CoilFile& made_;
  Complaints& complaints_;
  int count_ = 0;  // of complaints
};

void override_key(toml::table& root, const std::string& text, Complaints& complaints) {
  const auto equals = text.find('='), dot = text.find('.');
  if (equals == std::string::npos)
    return complaints.add({}, fmt::format("--set {}: write TABLE.KEY=VALUE, like place.gap=\"3 mm\"", text));
  const std::string value = text.substr(equals + 1);
  if (dot == std::string::npos || dot > equals) {
    root.insert_or_assign(text.substr(0, equals), value);
    return;
  }
  const std::string name = text.substr(0, dot), key = text.substr(dot + 1, equals - dot - 1);
  if (!root.contains(name)) root.insert(name, toml::table{});
  if (auto* table = root.get_as<toml::table>(name)) table->insert_or_assign(key, value);
}

}  // namespace

CoilFile parse_coil_file(const std::string& text, const std::string& file,
                         const std::vector<std::string>& overrides) {
  CoilFile made;
  made.file = file, made.text = text, made.sha256 = sha256(text);
  Complaints complaints(file, text);
  toml::table root;
  try {
    root = toml::parse(text, file);
  } catch (const toml::parse_error& error) {
    const auto& at = error.source().begin;
    complaints.add({static_cast<int>(at.line), static_cast<int>(at.column)},
                   std::string(error.description()));
    complaints.raise();
  }
  for (const std::string& o : overrides) override_key(root, o, complaints);
  CoilFileReader(made, complaints).read(root);
  complaints.raise();
  return made;
}

CoilFile read_coil_file(const std::string& file, const std::vector<std::string>& overrides) {
  std::ifstream in(file, std::ios::binary);
  const std::string text{std::istreambuf_iterator<char>(in), {}};
  if (!in.is_open() || in.bad())
    throw InputError(fmt::format("{}: cannot be read; check the name and the folder", file));
  return parse_coil_file(text, file, overrides);
}

}  // namespace couplet
