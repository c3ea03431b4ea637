// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind bridge_kind = {
    "bridge",
    "block: four rectifier diodes; pieces upper_a, upper_b, lower_a, lower_b",
    {{"ac_a", "first alternating node"},
     {"ac_b", "second alternating node"},
     {"plus", "positive output"},
     {"minus", "negative output"}},
    diode_keys(),
    two_terminal_ratings(),
    R"(kind = "bridge"
ac_a = "pick_a"
ac_b = "pick_b"
plus = "rail"
minus = "gnd"
forward_drop = "0.4 V"
capacitance = "150 pF")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const auto one = [&](const std::string& piece, Node anode, Node cathode) {
        const std::string full = name + "." + piece;
        const int part = sheet.part(full, "diode", anode, cathode);
        write_diode(sheet, part, full, anode, cathode, diode_law(v));
        write_capacitor(sheet, part, anode, cathode, v["capacitance"]);
      };
      one("upper_a", n.at("ac_a"), n.at("plus"));
      one("upper_b", n.at("ac_b"), n.at("plus"));
      one("lower_a", n.at("minus"), n.at("ac_a"));
      one("lower_b", n.at("minus"), n.at("ac_b"));
    }};

}  // namespace couplet
