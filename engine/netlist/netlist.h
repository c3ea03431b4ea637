// SPDX-License-Identifier: MIT
// A design as read from a netlist: text in, checked SI values out, each with the place it came from.
#pragma once

#include <map>
#include <optional>
#include <stdexcept>
#include <string>
#include <vector>

#include "models/law.h"
#include "models/schema.h"

namespace couplet {

struct Place {
  int line = 0, column = 0;  // 1-based; 0: not from the text (a default, an override)
};

/// A value with everything a netlist may say of it. `given` names the [given] entry it follows, or is empty.
struct Quantity {
  double value = 0;  // SI
  std::string unit;  // SI unit, for print
  std::string given;
  std::optional<double> tolerance;  // relative, half width (0.05 for 5 %)
  std::string origin;               // "measured", "datasheet p. 4", "guessed": free text, may be empty
  Place place;
};

struct Given {
  std::string name;
  Quantity quantity;
  std::optional<double> low, high;
};

struct PartEntry {
  std::string name;
  const PartKind* kind = nullptr;
  std::map<std::string, std::string> nodes;  // terminal ("across.0", "drain") -> node name
  std::map<std::string, Quantity> values;    // by key, defaults filled in
  std::map<std::string, std::string> words;
  std::map<std::string, std::vector<std::pair<double, double>>> tables;
  std::map<std::string, Quantity> ratings;  // by rating name
  Place place;
};

/// One [coupling.NAME]: between each two of `coils`, by factor or by mutual inductance.
struct CouplingEntry {
  std::string name;
  std::vector<std::string> coils;  // part names; "PART.piece" for a coil inside a block
  bool by_factor = true;
  Quantity amount;  // factor (unit "1") or mutual inductance (H)
  Place place;
};

/// At `time`, the givens named take new values.
struct ScheduleEntry {
  Quantity time;
  std::map<std::string, Quantity> changes;
  Place place;
};

struct Limit {
  std::string name, figure;
  std::optional<Quantity> at_least, at_most;  // "within" sets both
  std::string why, source;
  Place place;
};

/// What to record and for how long to march. Absent: decided by the program, which says what it chose.
struct RunSettings {
  std::optional<double> duration;        // s, of `couplet start`
  std::optional<double> step_ceiling;    // s
  std::vector<std::string> record;       // signals; empty: all node voltages, coil and part currents
  std::optional<int> points_per_period;  // of full detail
  std::string section;                   // "voltage of NODE - NODE" or empty: chosen by the program
  std::optional<int> window_periods;     // of the figures' window
};

struct Design {
  std::string file, text, sha256;
  std::string title;
  std::string rail;                   // node
  std::string load, regulator;        // parts; may be empty
  std::vector<std::string> supplies;  // parts; those of role source where the netlist does not say
  std::vector<std::string> assumptions, not_modelled;  // free text for the page
  double derating = 1;                                 // ratings are judged at this share
  std::map<std::string, Place> role_places;  // where rail, load, regulator, supplies are stated
  std::vector<Given> given;
  std::vector<PartEntry> parts;
  std::vector<CouplingEntry> couplings;
  std::vector<ScheduleEntry> schedule;
  std::vector<Limit> limits;
  RunSettings run;

  /// Overrides a given ("load") or a part's value ("dock_coil.inductance"), SI.
  /// Throws InputError where there is no such name or the value is out of its range.
  void set(const std::string& name, double value);
  /// The same from text with a unit ("10 ohm"), as `--set NAME=VALUE` has it.
  void set(const std::string& name, const std::string& text);
  /// Current value and SI unit of a given or a part's value; throws InputError.
  Quantity get(const std::string& name) const;
  /// Every name that set() takes and that is toleranced or given.
  std::vector<std::string> settable() const;
};

/// All complaints of a netlist or a call at once; what() holds them as they are to be printed, one after
/// another, each as "FILE:LINE:COLUMN: what is wrong; what to do" followed by an excerpt with the place
/// marked. Exit status 2.
class InputError : public std::runtime_error {
 public:
  explicit InputError(const std::string& text) : std::runtime_error(text) {}
};

/// Reads and checks a netlist. `overrides` are "NAME=VALUE" texts. Throws InputError with all complaints.
Design read_netlist(const std::string& file, const std::vector<std::string>& overrides = {});
/// The same from text; `file` is the name used in complaints.
Design parse_netlist(const std::string& text, const std::string& file,
                     const std::vector<std::string>& overrides = {});

/// The elements of all parts and couplings with the values that hold at `time` of the schedule (entries with
/// a time at or before it applied). The order of parts, nodes and elements does not depend on values.
Sheet build_sheet(const Design& design, double time = 0);

}  // namespace couplet
