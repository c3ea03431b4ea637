// SPDX-License-Identifier: MIT
// What every part must keep to, whatever it is: one checker a property. Each returns what is wrong in plain
// words, an empty list where nothing is. catalogue.cpp runs them over all parts, liars.cpp shows each a part
// that breaks it.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

#include "engine/circuit/circuit.h"
#include "models/schema.h"

namespace couplet::test {

using Faults = std::vector<std::string>;

/// Random numbers that are the same everywhere.
class Dice {
 public:
  explicit Dice(std::uint64_t seed) : state_(seed) {}
  std::uint64_t bits();
  double share();      // in [0, 1)
  double any_scale();  // either sign, from a thousandth to a thousand, all scales alike
 private:
  std::uint64_t state_;
};

/// One state of everything that a form can refer to.
struct Point {
  std::vector<double> volts, amperes, waves;  // by node (gnd: 0), coil, waveform
};
double value(const Form& form, const Point& at);
/// Sum of the sizes of its terms: what its round-off is measured by.
double size(const Form& form, const Point& at);

/// The part of that kind alone on a sheet, each terminal on a node of its own, none of them gnd.
Sheet alone(const PartKind& kind, const Values& values);
/// The values that the kind's own example and defaults give, through the netlist reader. Empty values and a
/// fault where the reader refuses the example.
Values example_values(const PartKind& kind, Faults& faults);

/// Name, terminals, keys, ratings, example: documented, unique, with defaults in range and units that can be
/// read.
Faults schema_faults(const PartKind& kind);
/// Indices that exist, numbers that are finite, elements of positive size, names below the part's own.
Faults element_faults(const Sheet& sheet, const std::string& name);
/// Cells of each branch: every combination of bits has exactly one.
Faults cover_faults(const Sheet& sheet);
/// Along random straight lines through the space of voltages the current has no step at any border (bits with
/// hysteresis and commanded bits held), and no branch absorbs less than its electromotive force delivers.
/// `all_cells`: also that every cell was met.
Faults law_faults(const Sheet& sheet, bool all_cells);
/// The circuit's assembled system, cell by cell, against currents added up element by element. `sheet` is
/// what the circuit should have been made of.
Faults stamp_faults(const Circuit& circuit, const Sheet& sheet);
/// The sheet with every node tied to gnd, so that it makes a circuit.
Sheet tied(Sheet sheet);

/// cover, element and law faults together.
Faults part_faults(const Sheet& sheet, const std::string& name, bool all_cells);

}  // namespace couplet::test
