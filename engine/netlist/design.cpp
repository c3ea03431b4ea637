// SPDX-License-Identifier: MIT
// A design's values by name, and the sheet made from them.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "engine/netlist/checks.h"
#include "engine/netlist/complaints.h"
#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

/// Every value that follows the given takes its value.
void spread(Design& design, const Given& given) {
  for (auto& part : design.parts) {
    for (auto& [key, q] : part.values) {
      if (q.given == given.name) q.value = given.quantity.value;
    }
  }
  for (auto& coupling : design.couplings) {
    if (coupling.amount.given == given.name) coupling.amount.value = given.quantity.value;
  }
}

struct Target {
  Given* given = nullptr;
  Quantity* quantity = nullptr;
  const Key* key = nullptr;
};

Target find(Design& design, const std::string& name) {
  for (auto& g : design.given) {
    if (g.name == name) return {&g, &g.quantity, nullptr};
  }
  std::vector<std::string> known = design.settable();
  const auto dot = name.find('.');
  if (dot != std::string::npos) {
    for (auto& part : design.parts) {
      if (part.name != name.substr(0, dot)) continue;
      const auto value = part.values.find(name.substr(dot + 1));
      if (value == part.values.end()) break;
      for (const auto& key : part.kind->keys) {
        if (key.name == value->first) return {nullptr, &value->second, &key};
      }
    }
    for (auto& coupling : design.couplings) {
      if (name == coupling.name + (coupling.by_factor ? ".factor" : ".mutual"))
        return {nullptr, &coupling.amount, nullptr};
    }
  }
  throw InputError(
      fmt::format("there is no value \"{}\" to set{}", name.substr(0, 128), nearest(name, known)));
}

}  // namespace

void Design::set(const std::string& name, double value) {
  const Target target = find(*this, name);
  if (target.key && (value < target.key->low || value > target.key->high)) {
    throw InputError(fmt::format("{} is {}; it must lie between {} and {}", name,
                                 print_quantity(value, target.key->unit),
                                 print_quantity(target.key->low, target.key->unit),
                                 print_quantity(target.key->high, target.key->unit)));
  }
  target.quantity->value = value;
  target.quantity->place = {};
  if (target.given) {
    spread(*this, *target.given);
  } else {
    target.quantity->given.clear();
  }
}

void Design::set(const std::string& name, const std::string& words) {
  const Target target = find(*this, name);
  if (target.quantity->unit.empty())
    throw InputError(
        fmt::format("{} is given, but no part uses it; let a part have {{ given = \"{}\" }}", name, name));
  const ReadQuantity read = read_quantity(words, target.quantity->unit);
  if (!read.problem.empty()) throw InputError(fmt::format("--set {}: {}", name, read.problem));
  set(name, read.value);
  find(*this, name).quantity->origin = "set on the command line";
}

Quantity Design::get(const std::string& name) const {
  return *find(const_cast<Design&>(*this), name).quantity;
}

std::vector<std::string> Design::settable() const {
  std::vector<std::string> names;
  for (const auto& g : given) names.push_back(g.name);
  for (const auto& part : parts) {
    for (const auto& [key, q] : part.values) {
      if (q.given.empty()) names.push_back(part.name + "." + key);
    }
  }
  for (const auto& c : couplings) {
    if (c.amount.given.empty()) names.push_back(c.name + (c.by_factor ? ".factor" : ".mutual"));
  }
  return names;
}

Sheet build_sheet(const Design& original, double time) {
  Design design = original;
  for (const auto& entry : original.schedule) {
    if (entry.time.value > time) break;
    for (const auto& [name, q] : entry.changes) design.set(name, q.value);
  }
  Sheet sheet;
  for (const auto& part : design.parts) {
    for (const auto& terminal : part.kind->terminals) {
      for (const auto& suffix : {"", ".0", ".1"}) {
        if (const auto found = part.nodes.find(terminal.name + suffix); found != part.nodes.end())
          sheet.node(found->second);
      }
    }
  }
  for (const auto& part : design.parts) {
    Nodes nodes;
    for (const auto& [terminal, node] : part.nodes) nodes[terminal] = sheet.node(node);
    part.kind->write(sheet, part.name, nodes, values_of(part));
  }
  const auto coil = [&](const std::string& name) {
    const auto found =
        std::find_if(sheet.coils.begin(), sheet.coils.end(), [&](const Coil& c) { return c.name == name; });
    return static_cast<int>(found - sheet.coils.begin());
  };
  for (const auto& c : design.couplings) {
    for (std::size_t a = 0; a < c.coils.size(); ++a) {
      for (std::size_t b = a + 1; b < c.coils.size(); ++b) {
        const int i = coil(c.coils[a]), j = coil(c.coils[b]);
        const double mutual =
            c.by_factor ? c.amount.value * std::sqrt(sheet.coils[i].inductance * sheet.coils[j].inductance)
                        : c.amount.value;
        sheet.couplings.push_back({i, j, mutual});
      }
    }
  }
  return sheet;
}

}  // namespace couplet
