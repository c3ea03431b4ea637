// SPDX-License-Identifier: MIT
// What counts as one period: the common period of the commands and waveforms of a driven circuit, or the rising zero
// crossings of a chosen quantity (the section) of one that oscillates by itself.
#pragma once

#include <string>

#include "engine/circuit/circuit.h"

namespace couplet {

struct Section {
  bool driven = false;
  double period = 0;       // s, driven
  std::string words;       // "voltage of tank_capacitor rises through zero", "the common period of ..."
  Form form;               // free
  std::string problem;     // not empty: there is none, and why
};

/// `wanted`: "" (chosen here), or a part's name: its voltage. A free circuit is marched from rest for a while to see what
/// swings; `patience` (s, > 0) bounds that while.
Section find_section(const Sheet& sheet, const std::string& wanted, double patience);

/// Period of the slowest lightly damped mode at rest, or the slowest time constant where nothing rings, s.
double natural_period(const Circuit& circuit);

}  // namespace couplet
