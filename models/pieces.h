// SPDX-License-Identifier: MIT
// Laws that several kinds of parts are made of.
#pragma once

#include "models/schema.h"

namespace couplet {

/// forward drop (V), on-resistance (ohm), leakage resistance (ohm). Off below the drop, both sides meet
/// there: i = v / leakage, plus (v - drop) / on for v > drop.
struct DiodeLaw {
  double drop, on, leakage;
};
void write_diode(Sheet& sheet, int part, const std::string& name, Node anode, Node cathode,
                 const DiodeLaw& law);

/// A resistor that a command closes and opens.
void write_switch(Sheet& sheet, int part, const std::string& name, Node from, Node to, const Command& command,
                  double on, double off);

/// Three regions, both ways: channel current = clamp(v_ds / on, -gm ov, +gm ov), ov = max(0, v_gs -
/// threshold).
struct FetLaw {
  double threshold, transconductance, on, leakage;
};
void write_channel(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
                   const FetLaw& law);

/// Capacitor that is left out where its value is zero.
void write_capacitor(Sheet& sheet, int part, Node from, Node to, double farads);

std::vector<Key> diode_keys();  // forward_drop, on_resistance, leakage, capacitance (functions: tables in
                                // other files are built at start-up)
DiodeLaw diode_law(const Values& values);
std::vector<Key> fet_keys();
FetLaw fet_law(const Values& values);
/// The fet's channel, body diode and capacitances, all on one account.
void write_fet(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
               const Values& values);

std::vector<Rating> two_terminal_ratings();

/// Joins lists of keys.
std::vector<Key> joined(std::vector<Key> first, const std::vector<Key>& second);

}  // namespace couplet
