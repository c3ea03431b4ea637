// SPDX-License-Identifier: MIT
// The self-oscillating pair of a current-fed transmitter. Each gate is drawn to the feed by its pull-up and
// drawn down through a diode by the other drain, so that one switch holds the other off; which one wins at
// the start is decided by how the halves differ.
#include "models/pieces.h"

namespace couplet {
namespace {

void write_half(Sheet& sheet, const std::string& name, const Nodes& n, const std::string& side,
                const std::string& other, const Values& v, double threshold, double pull_up) {
  const std::string half = name + "." + side;
  const Node drain = n.at(side), feed = n.at("feed"), common = n.at("common");
  Values own = v;
  own.numbers["threshold"] = threshold;
  const int fet = sheet.part(half + "_switch", "fet", drain, common);
  const Node gate = sheet.node(half + "_gate");
  write_fet(sheet, fet, half + "_switch", drain, gate, common, own);
  sheet.resistor(sheet.part(half + "_pull_up", "resistor", feed, gate), feed, gate, pull_up);
  const int diode = sheet.part(half + "_gate_diode", "diode", gate, n.at(other));
  write_diode(sheet, diode, half + "_gate_diode", gate, n.at(other),
              {v["gate_diode_drop"], v["gate_diode_resistance"], v["gate_diode_leakage"]});
  write_capacitor(sheet, diode, gate, n.at(other), v["gate_diode_capacitance"]);
  sheet.resistor(sheet.part(half + "_bleed", "resistor", gate, common), gate, common, v["bleed"]);
  if (v.has("gate_clamp")) {
    const int clamp = sheet.part(half + "_gate_clamp", "clamp", gate, common);
    // The way back is a forward diode; leakage is the bleed's business.
    write_clamp(sheet, clamp, half + "_gate_clamp", gate, common,
                {v["gate_clamp"], 0.7, v["gate_clamp_resistance"], never});
  }
}

}  // namespace

extern const PartKind push_pull_kind = {
    "push_pull",
    "block: a self-oscillating pair, each gate pulled up from the feed and pulled down through a diode by "
    "the other drain; pieces left_switch, right_switch, left_pull_up, right_pull_up, left_gate_diode, "
    "right_gate_diode, left_bleed, right_bleed and, where gate_clamp is given, left_gate_clamp, "
    "right_gate_clamp",
    {{"left", "first drain"},
     {"right", "second drain"},
     {"feed", "node that pulls the gates up"},
     {"common", "source node"}},
    joined(
        fet_keys(),
        {{"mismatch", "V", "threshold of the right switch above that of the left", "20 mV", -10, 10},
         {"pull_up", "ohm", "gate pull-up", "470 ohm", 1e-3, 1e9},
         {"pull_up_mismatch", "1", "pull-up of the right gate above that of the left, as a share", "0", -0.9,
          10},
         {"bleed", "ohm", "gate to source", "10 kohm", 1, 1e12},
         {"gate_diode_drop", "V", "forward drop of the cross diodes", "0.35 V", 0, 100},
         {"gate_diode_resistance", "ohm", "slope of the cross diodes", "0.3 ohm", 1e-9, 1e6},
         {"gate_diode_leakage", "ohm", "resistance of the cross diodes while they block", "1 Mohm", 1, 1e15},
         {"gate_diode_capacitance", "F", "capacitance of the cross diodes, taken as constant", "0 F", 0, 1},
         {"gate_clamp", "V", "breakdown of a clamp from each gate to the source", "-", 1e-3, 1e6},
         {"gate_clamp_resistance", "ohm", "slope of the gate clamps", "1 ohm", 1e-9, 1e6}}),
    ratings_of("fet"),
    R"(kind = "push_pull"
left = "left"
right = "right"
feed = "vin"
common = "gnd"
threshold = "2.0 V"
mismatch = "20 mV"
gate_clamp = "15 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      write_half(sheet, name, n, "left", "right", v, v["threshold"], v["pull_up"]);
      write_half(sheet, name, n, "right", "left", v, v["threshold"] + v["mismatch"],
                 v["pull_up"] * (1 + v["pull_up_mismatch"]));
    }};

}  // namespace couplet
