// SPDX-License-Identifier: MIT
// A file that gives coils by their geometry, as `couplet coil` reads it: TOML, values with units, all
// complaints at once.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "engine/netlist/netlist.h"
#include "models/coil/link.h"

namespace couplet {

/// Currents, rms, and the distances from the copper at which the field is wanted.
struct FieldRequest {
  double first_current = 0, second_current = 0;  // A
  double phase = 0;                              // rad, of the second against the first
  std::vector<double> distances;                 // m
};

/// The band over which ladders are fitted, and the deviation that is good enough.
struct LadderRequest {
  double low = 0, high = 0, deviation = 0.01;
};

struct CoilFile {
  std::string file, text, sha256, title;
  double frequency = 0;     // Hz
  double temperature = 20;  // degC, of the copper
  coil::Winding first;
  std::optional<coil::Winding> second;
  coil::Placement place;
  coil::Surroundings sheets;
  std::vector<double> gaps, shifts;  // m, of the map; empty: no map asked for
  std::optional<FieldRequest> field;
  std::optional<LadderRequest> ladder;
};

/// Reads and checks. `overrides` are "TABLE.KEY=VALUE" texts ("place.gap=3 mm"). Throws InputError with all
/// complaints.
CoilFile read_coil_file(const std::string& file, const std::vector<std::string>& overrides = {});
/// The same from text; `file` is the name used in complaints.
CoilFile parse_coil_file(const std::string& text, const std::string& file,
                         const std::vector<std::string>& overrides = {});

}  // namespace couplet
