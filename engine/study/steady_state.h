// SPDX-License-Identifier: MIT
// `settle`: a design's periodic steady state with its figures.
#pragma once

#include "engine/figures/harmonics.h"
#include "engine/figures/steady.h"
#include "engine/figures/timeline.h"
#include "engine/figures/verdict.h"
#include "engine/netlist/netlist.h"
#include "engine/orbit/settle.h"

namespace couplet {

/// A circuit with its lapper and quantities, for one set of values.
struct Bench {
  Bench(const Design& design, const Section& section, const MarchSettings& settings);
  Circuit circuit;
  Lapper lapper;
  Quantities quantities;
};

struct HarmonicRow {
  std::string quantity;
  int order;
  double frequency, amplitude;  // Hz, A or V
};

struct SteadyState {
  Section section;
  Orbit orbit;
  Figures figures;                      // of one exact period
  std::vector<Verdict> verdicts;
  std::vector<Timeline::Stretch> timeline;
  std::vector<HarmonicRow> harmonics;   // of the coils' and supplies' currents
  EnergyAccount ledger;                 // of one period
  std::unique_ptr<Bench> bench;
  double seconds_figures = 0;
};

/// The section of a design; `patience` as in find_section, from the netlist's duration or natural periods.
Section section_of(const Design& design);
double patience_of(const Design& design);

/// Throws InputError, CircuitError. What was found (or not) is in orbit.
SteadyState run_settle(const Design& design, const Section* section = nullptr);

/// Figures of one lap of an orbit, appended to those that the orbit itself has (stability).
Figures orbit_figures(Bench& bench, const Orbit& orbit, SteadyState* details = nullptr);

}  // namespace couplet
