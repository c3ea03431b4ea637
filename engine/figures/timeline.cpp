// SPDX-License-Identifier: MIT
#include "engine/figures/timeline.h"

#include <algorithm>
#include <cmath>
#include <map>

namespace couplet {

Timeline::Timeline(const Circuit& circuit) : circuit_(circuit) {}

void Timeline::span(const Span& span) {
  const auto& branches = circuit_.sheet().branches;
  if (open_.empty()) {
    for (int b = 0; b < static_cast<int>(branches.size()); ++b) open_.push_back({b, span.topology->cells[b], span.start, span.start});
  }
  const double end = span.start + span.duration;
  for (auto& s : open_) {
    if (s.cell != span.topology->cells[s.branch]) {
      if (branches[s.branch].cells.size() > 1 && s.to > s.from) done_.push_back(s);
      s.cell = span.topology->cells[s.branch];
      s.from = span.start;
    }
    s.to = end;
  }
  last_ = span.topology;
}

void Timeline::event(const Event& event) {
  if (event.branch < 0 || !event.bit || event.condition != 0) return;
  const Branch& branch = circuit_.sheet().branches[event.branch];
  const SheetPart& part = circuit_.sheet().parts[branch.part];
  // A switch's command, or a fet's gate passing its threshold.
  if (branch.name != part.name || (part.kind != "switch" && part.kind != "fet")) return;
  const Eigen::Map<const Eigen::VectorXd> x(event.x, circuit_.size());
  const auto voltage = [&](Node n) { return n > 0 ? event.after->C.row(circuit_.row_of_node(n)).dot(x) : 0.0; };
  const double v = voltage(branch.from) - voltage(branch.to);
  double capacitance = 0;
  for (const auto& c : circuit_.sheet().capacitors) {
    if (c.part == branch.part && c.from == branch.from && c.to == branch.to) capacitance += c.capacitance;
  }
  edges_.push_back({branch.part, event.time, v, 0.5 * capacitance * v * v});
}

std::vector<Timeline::Stretch> Timeline::stretches() const {
  auto all = done_;
  for (const auto& s : open_) {
    if (circuit_.sheet().branches[s.branch].cells.size() > 1 && s.to > s.from) all.push_back(s);
  }
  std::stable_sort(all.begin(), all.end(), [](const Stretch& a, const Stretch& b) { return a.branch != b.branch ? a.branch < b.branch : a.from < b.from; });
  return all;
}

void Timeline::add_figures(Figures& figures) const {
  std::map<int, Edge> worst;
  std::map<int, double> energy;
  for (const auto& e : edges_) {
    energy[e.part] += e.energy;
    const auto found = worst.find(e.part);
    if (found == worst.end() || std::abs(e.voltage) > std::abs(found->second.voltage)) worst[e.part] = e;
  }
  for (const auto& [part, e] : worst) {
    const std::string& name = circuit_.sheet().parts[part].name;
    figures.set(name + ".edge.voltage", std::abs(e.voltage), "V", e.time);
    figures.set(name + ".edge.energy", energy[part], "J");
  }
}

}  // namespace couplet
