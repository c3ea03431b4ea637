// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind diode_kind = {
    "diode",
    "a diode: drop and slope when it conducts, leakage when it blocks",
    {{"anode", "current enters here"}, {"cathode", "and leaves here"}},
    diode_keys(),
    two_terminal_ratings(),
    R"(kind = "diode"
anode = "gate_left"
cathode = "right"
forward_drop = "0.35 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node anode = n.at("anode"), cathode = n.at("cathode");
      const int part = sheet.part(name, "diode", anode, cathode);
      write_diode(sheet, part, name, anode, cathode, diode_law(v));
      write_capacitor(sheet, part, anode, cathode, v["capacitance"]);
    }};

}  // namespace couplet
