// SPDX-License-Identifier: MIT
// Which branch is in which cell, when; and what each switch finds across it when it is turned on.
#pragma once

#include "engine/figures/figure.h"
#include "engine/march/march.h"

namespace couplet {

class Timeline : public Observer {
 public:
  struct Stretch {
    int branch;
    int cell;
    double from, to;  // s
  };
  struct Edge {
    int part;
    double time, voltage, energy;  // s, V across the part just before it is turned on, J lost of its own capacitance
  };
  explicit Timeline(const Circuit& circuit);
  void span(const Span& span) override;
  void event(const Event& event) override;
  /// All stretches of branches with more than one cell, in order of branch and time.
  std::vector<Stretch> stretches() const;
  const std::vector<Edge>& edges() const { return edges_; }
  /// Adds PART.edge.voltage (largest) and PART.edge.energy (sum over the time seen) for each switch that was turned on.
  void add_figures(Figures& figures) const;

 private:
  const Circuit& circuit_;
  std::vector<Stretch> done_, open_;
  std::vector<Edge> edges_;
  const Topology* last_ = nullptr;
};

}  // namespace couplet
