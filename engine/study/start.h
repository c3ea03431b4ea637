// SPDX-License-Identifier: MIT
// A start-up: march from rest (or from a given state) through the supply's rise and the netlist's schedule, and the
// figures, ledger and verdicts that come of it.
#pragma once

#include <functional>

#include "engine/figures/steady.h"
#include "engine/figures/verdict.h"
#include "engine/march/march.h"
#include "engine/netlist/netlist.h"
#include "engine/orbit/section.h"

namespace couplet {

struct StartResult;

struct StartOptions {
  bool ida = false;
  MarchSettings march;
  double duration = 0;  // s; 0: the netlist's, or 800 natural periods
  Section section;                                      // already known; found here where words is empty
  std::function<void(double share)> progress;           // called now and then with the share done
  std::function<void(const Circuit&, double time)> on_circuit;  // a new circuit begins (start, scheduled change)
  std::function<void(const StartResult&)> on_end;       // all is marched, the last circuit still stands
  std::vector<Observer*> observers;                     // further ones
};

struct StartResult {
  Figures figures;
  std::vector<Verdict> verdicts;
  EnergyAccount ledger;   // over the whole march
  MarchReport report;     // counts and seconds summed over all legs
  Section section;
  double duration = 0, window_from = 0, window_to = 0;
  long window_periods = 0;
  std::string outcome;    // "oscillates at 170.3 kHz", "does not oscillate: ..."
  bool oscillates = false;
  std::vector<std::string> notes;
  std::vector<std::pair<double, double>> returns;  // time of each section crossing, rail voltage there
  Sheet sheet;
};

/// Throws InputError or CircuitError for what cannot be marched at all; a march that fails on the way is in the report.
StartResult run_start(const Design& design, StartOptions options);

/// The roles of a design on its sheet.
Roles roles_of(const Design& design, const Sheet& sheet);

}  // namespace couplet
