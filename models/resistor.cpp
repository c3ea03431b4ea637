// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind resistor_kind = {
    "resistor",
    "a linear resistor",
    {{"across", "the two nodes"}},
    {{"resistance", "ohm", "resistance", "", 1e-12, 1e18}},
    two_terminal_ratings(),
    R"(kind = "resistor"
across = ["gate_left", "gnd"]
resistance = "10 kohm")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      sheet.resistor(sheet.part(name, "resistor", plus, minus), plus, minus, v["resistance"]);
    }};

}  // namespace couplet
