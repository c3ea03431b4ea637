// SPDX-License-Identifier: MIT
// Laws, keys and ratings that several kinds of parts are made of.
#pragma once

#include <limits>

#include "models/schema.h"

namespace couplet {

/// A resistance that is not there.
inline constexpr double never = std::numeric_limits<double>::infinity();

/// Forward drop (V), on-resistance (ohm), leakage resistance (ohm; `never`: none). i = v / leakage, and
/// (v - drop) / on more for v > drop, so that both sides meet at the drop.
struct DiodeLaw {
  double drop, on, leakage;
};
void write_diode(Sheet& sheet, int part, const std::string& name, Node anode, Node cathode,
                 const DiodeLaw& law);

/// Breakdown (V) from `plus` to `minus`, the same backward (V), slope (ohm) beyond both, leakage resistance
/// (ohm; `never`: none).
struct ClampLaw {
  double breakdown, backward, slope, leakage;
};
void write_clamp(Sheet& sheet, int part, const std::string& name, Node plus, Node minus, const ClampLaw& law);

/// A resistor that a command closes (`on`, ohm) and opens (`off`, ohm).
void write_switch(Sheet& sheet, int part, const std::string& name, Node from, Node to, const Command& command,
                  double on, double off);

/// A current (A) that is constant above `knee` (V) and in proportion to the voltage below, also below zero.
/// `states` are the words for below and above.
void write_draw(Sheet& sheet, int part, const std::string& name, Node from, Node to, double current,
                double knee, std::pair<const char*, const char*> states);

/// Three regions, both ways: channel current = clamp(v_ds / on, -gm ov, +gm ov), ov = max(0, v_gs -
/// threshold), and v_ds / leakage beside it.
struct FetLaw {
  double threshold, transconductance, on, leakage;
};
void write_channel(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
                   const FetLaw& law);

/// Capacitor that is left out where its value is zero.
void write_capacitor(Sheet& sheet, int part, Node from, Node to, double farads);

/// The fet's channel, body diode and capacitances, all on one account. `values` has the keys of fet_keys().
void write_fet(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
               const Values& values);

/// One leg between `high` and `low`: pieces NAME.upper and NAME.lower, two commanded switches in turn, each
/// with an antiparallel diode and an output capacitance. `values` has the keys of command_keys() and
/// leg_keys(); `phase` is where the upper one closes, as a share of the period.
void write_leg(Sheet& sheet, const std::string& name, Node high, Node middle, Node low, const Values& values,
               double phase);

// Keys are functions, since tables in other files are built at start-up in no particular order.
std::vector<Key> diode_keys();
std::vector<Key> fet_keys();
std::vector<Key> command_keys();
std::vector<Key> leg_keys();
/// From the keys forward_drop, on_resistance, leakage.
DiodeLaw diode_law(const Values& values);
Command command_of(const Values& values, double duty, double phase);
/// For PartKind::check: a dead time that leaves nothing of the on time, `duty` being its share of the period.
std::string check_dead_time(const Values& values, double duty);

/// Voltage, current (peak and effective), power.
std::vector<Rating> two_terminal_ratings();
/// The same of a block, for its pieces of one kind.
std::vector<Rating> ratings_of(const std::string& piece);

/// Joins lists of keys.
std::vector<Key> joined(std::vector<Key> first, const std::vector<Key>& second);

}  // namespace couplet
