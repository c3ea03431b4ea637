// SPDX-License-Identifier: MIT
#include "engine/netlist/checks.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

std::vector<std::string> part_names(const Design& design) {
  std::vector<std::string> names;
  for (const auto& p : design.parts) names.push_back(p.name);
  return names;
}

const PartEntry* find_part(const Design& design, const std::string& name) {
  for (const auto& p : design.parts) {
    if (p.name == name) return &p;
  }
  return nullptr;
}

void check_nodes(const Design& design, Complaints& complaints) {
  std::map<std::string, std::vector<const PartEntry*>> touched;
  for (const auto& part : design.parts) {
    std::set<std::string> own;
    for (const auto& [terminal, node] : part.nodes) {
      touched[node].push_back(&part);
      own.insert(node);
    }
    if (part.nodes.size() > 1 && own.size() == 1) {
      complaints.add(part.place, fmt::format("all terminals of {} are tied to {}; give it two nodes",
                                             part.name, *own.begin()));
    }
  }
  std::vector<std::string> names;
  for (const auto& [node, parts] : touched) names.push_back(node);
  if (!design.parts.empty() && !touched.count("gnd")) {
    complaints.add(design.parts.front().place, "no part is tied to gnd; name the reference node \"gnd\"");
  }
  for (const auto& [node, parts] : touched) {
    if (parts.size() != 1 || node == "gnd") continue;
    std::vector<std::string> others;
    for (const auto& n : names) {
      if (n != node) others.push_back(n);
    }
    std::string hint = nearest(node, others);
    if (hint.rfind("; did", 0) != 0) hint = "; connect something else to it or leave the part out";
    complaints.add(parts.front()->place, fmt::format("node {} leads nowhere: only {} touches it{}", node,
                                                     parts.front()->name, hint));
  }
  if (!design.rail.empty() && !touched.count(design.rail)) {
    complaints.add(design.role_places.count("rail") ? design.role_places.at("rail") : Place{}, fmt::format("rail names the node \"{}\", which no part touches{}", design.rail,
                                   nearest(design.rail, names)));
  }
}

void check_roles(const Design& design, Complaints& complaints) {
  const auto names = part_names(design);
  const auto place = [&](const std::string& role) { return design.role_places.count(role) ? design.role_places.at(role) : Place{}; };
  const auto check = [&](const std::string& role, const std::string& name, const std::string& starts) {
    if (name.empty()) return;
    const PartEntry* part = find_part(design, name);
    if (!part) {
      complaints.add(place(role), fmt::format("{} names the part \"{}\", which does not exist{}", role, name,
                                     nearest(name, names)));
    } else if (part->kind->kind.rfind(starts, 0) != 0) {
      complaints.add(part->place,
                     fmt::format("{} names {}, which is a {}; name a part whose kind begins with \"{}\"",
                                 role, name, part->kind->kind, starts));
    }
  };
  check("load", design.load, "load");
  check("regulator", design.regulator, "regulator");
  for (const auto& s : design.supplies) {
    if (!find_part(design, s))
      complaints.add(
          {}, fmt::format("supplies names the part \"{}\", which does not exist{}", s, nearest(s, names)));
  }
  const bool source = std::any_of(design.parts.begin(), design.parts.end(), [](const PartEntry& p) {
    return p.kind->kind == "supply" || p.kind->kind == "current_source";
  });
  if (!design.parts.empty() && !source)
    complaints.add(design.parts.front().place, "nothing supplies the circuit; add a part of kind supply");
}

void check_couplings(const Design& design, Complaints& complaints) {
  std::vector<const PartEntry*> coils;
  for (const auto& p : design.parts) {
    if (p.kind->kind == "coil") coils.push_back(&p);
  }
  std::vector<std::string> names;
  for (const auto* c : coils) names.push_back(c->name);
  const auto index = [&](const std::string& name) {
    return static_cast<int>(std::find(names.begin(), names.end(), name) - names.begin());
  };
  const int n = static_cast<int>(coils.size());
  std::vector<std::vector<double>> k(n, std::vector<double>(n, 0));
  std::set<std::pair<int, int>> seen;
  bool sound = true;
  for (const auto& coupling : design.couplings) {
    for (const auto& name : coupling.coils) {
      if (index(name) < n) continue;
      sound = false;
      complaints.add(coupling.place, fmt::format("coupling {} names \"{}\", which is no coil{}",
                                                 coupling.name, name, nearest(name, names)));
    }
    for (std::size_t a = 0; a < coupling.coils.size(); ++a) {
      for (std::size_t b = a + 1; b < coupling.coils.size(); ++b) {
        const int i = index(coupling.coils[a]), j = index(coupling.coils[b]);
        if (i >= n || j >= n) continue;
        if (i == j) {
          complaints.add(coupling.place, fmt::format("coupling {} couples {} to itself; name two coils",
                                                     coupling.name, coupling.coils[a]));
          sound = false;
          continue;
        }
        if (!seen.insert(std::minmax(i, j)).second) {
          complaints.add(coupling.place,
                         fmt::format("coupling {} states the pair {}, {} a second time; keep one",
                                     coupling.name, coupling.coils[a], coupling.coils[b]));
        }
        double factor = coupling.amount.value;
        if (!coupling.by_factor) {
          const auto li = coils[i]->values.find("inductance"), lj = coils[j]->values.find("inductance");
          if (li == coils[i]->values.end() || lj == coils[j]->values.end()) continue;
          factor /= std::sqrt(li->second.value * lj->second.value);
        }
        k[i][j] = k[j][i] = factor;
      }
    }
  }
  if (!sound || n == 0) return;
  // Cholesky of the matrix of factors: where a pivot is not positive, the coils met so far contradict each
  // other.
  std::vector<std::vector<double>> l(n, std::vector<double>(n, 0));
  for (int i = 0; i < n; ++i) k[i][i] = 1;
  for (int j = 0; j < n; ++j) {
    double pivot = k[j][j];
    for (int m = 0; m < j; ++m) pivot -= l[j][m] * l[j][m];
    if (!(pivot > 1e-12)) {
      Place place;
      std::string list;
      for (const auto& coupling : design.couplings) {
        if (std::find(coupling.coils.begin(), coupling.coils.end(), names[j]) == coupling.coils.end())
          continue;
        place = coupling.amount.place;
        list += (list.empty() ? "" : ", ") + coupling.name;
      }
      complaints.add(place, fmt::format("the coupling matrix is not positive definite: {} cannot be coupled "
                                        "to the others as {} say; lower a factor",
                                        names[j], list));
      return;
    }
    l[j][j] = std::sqrt(pivot);
    for (int i = j + 1; i < n; ++i) {
      double sum = k[i][j];
      for (int m = 0; m < j; ++m) sum -= l[i][m] * l[j][m];
      l[i][j] = sum / l[j][j];
    }
  }
}

}  // namespace

std::string unit_of_figure(const std::string& figure) {
  const auto ends = [&](const char* tail) {
    const std::string t = tail;
    return figure.size() >= t.size() && figure.compare(figure.size() - t.size(), t.size(), t) == 0;
  };
  if (figure == "frequency" || ends(".frequency")) return "Hz";
  if (figure == "period" || ends(".time") || ends(".time_above") || ends(".delay")) return "s";
  if (figure.rfind("rail.", 0) == 0 || figure == "regulator.headroom" || ends("output.mean")) return "V";
  if (ends(".loss") || ends(".power")) return "W";
  if (ends(".voltage.peak") || ends(".voltage.highest")) return "V";
  if (ends(".current.peak") || ends(".current.rms") || ends(".current.mean") || ends(".current.highest"))
    return "A";
  if (ends(".energy") || ends("stored.change")) return "J";
  if (ends(".temperature")) return "degC";
  return "1";
}

Values values_of(const PartEntry& part) {
  Values v;
  for (const auto& [key, q] : part.values) v.numbers[key] = q.value;
  v.words = part.words;
  v.tables = part.tables;
  return v;
}

void check_values(const Design& design, Complaints& complaints) {
  for (const auto& part : design.parts) {
    bool complete = true;
    for (const auto& key : part.kind->keys) {
      const bool optional = key.fallback == "-";
      if (key.type == Key::Type::word || key.type == Key::Type::table) continue;
      const auto found = part.values.find(key.name);
      if (found == part.values.end()) {
        complete = complete && optional;
        continue;
      }
      if (!std::isfinite(found->second.value)) complete = false;
      const double value = found->second.value;
      if ((found->second.place.line == 0 || !found->second.given.empty()) && (value < key.low || value > key.high)) {
        complaints.add(found->second.place, fmt::format("{}.{} is {}; it must lie between {} and {}", part.name, key.name,
                                       print_quantity(value, key.unit), print_quantity(key.low, key.unit),
                                       print_quantity(key.high, key.unit)));
      }
    }
    if (!complete || !part.kind->check) continue;
    const std::string problem = part.kind->check(values_of(part));
    if (!problem.empty()) complaints.add(part.place, fmt::format("part {}: {}", part.name, problem));
  }
  check_couplings(design, complaints);
}

void check_design(const Design& design, Complaints& complaints) {
  check_nodes(design, complaints);
  check_roles(design, complaints);
  check_values(design, complaints);
  std::set<std::string> names;
  for (const auto& g : design.given) names.insert(g.name);
  for (const auto& p : design.parts) {
    if (names.count(p.name))
      complaints.add(p.place,
                     fmt::format("{} is the name of a given value and of a part; rename one", p.name));
  }
}

}  // namespace couplet
