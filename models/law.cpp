// SPDX-License-Identifier: MIT
#include "models/law.h"

#include <algorithm>

namespace couplet {

Form& Form::plus(const Form& other, double k) {
  constant += k * other.constant;
  for (auto v : other.volts) volts.push_back({v.plus, v.minus, k * v.k});
  for (auto c : other.currents) currents.push_back({c.index, k * c.k});
  for (auto w : other.waves) waves.push_back({w.index, k * w.k});
  return *this;
}

Node Sheet::node(const std::string& name) {
  const auto found = std::find(nodes.begin(), nodes.end(), name);
  if (found != nodes.end()) return static_cast<Node>(found - nodes.begin());
  nodes.push_back(name);
  return static_cast<Node>(nodes.size()) - 1;
}

Node Sheet::inner(int part, const std::string& name) { return node(parts.at(part).name + "." + name); }

int Sheet::part(const std::string& name, const std::string& kind, Node plus, Node minus, Role role) {
  SheetPart p;
  p.name = name;
  p.kind = kind;
  p.plus = plus;
  p.minus = minus;
  p.role = role;
  parts.push_back(std::move(p));
  return static_cast<int>(parts.size()) - 1;
}

void Sheet::resistor(int part, Node from, Node to, double ohms) {
  Branch& b = branch(part, parts.at(part).name, from, to);
  b.cells.push_back({"", 0, 0, Form().volt(from, to, 1 / ohms)});
}

void Sheet::capacitor(int part, Node from, Node to, double farads, double volts_at_start) {
  capacitors.push_back({part, parts.at(part).name, from, to, farads, volts_at_start});
}

int Sheet::coil(int part, Node from, Node to, double henries, double ohms, double amperes_at_start) {
  coils.push_back({part, parts.at(part).name, from, to, henries, ohms, amperes_at_start});
  return static_cast<int>(coils.size()) - 1;
}

Branch& Sheet::branch(int part, const std::string& name, Node from, Node to) {
  Branch b;
  b.part = part;
  b.name = name;
  b.from = from;
  b.to = to;
  branches.push_back(std::move(b));
  return branches.back();
}

void Sheet::emf(int part, Node from, Node to, Form value) {
  emfs.push_back({part, parts.at(part).name, from, to, std::move(value)});
}

}  // namespace couplet
