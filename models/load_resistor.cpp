// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind load_resistor_kind = {
    "load_resistor",
    "a resistor whose power counts as delivered",
    {{"across", "positive and negative node"}},
    {{"resistance", "ohm", "resistance", "", 1e-9, 1e18}},
    two_terminal_ratings(),
    R"(kind = "load_resistor"
across = ["vout", "gnd"]
resistance = { value = "10 ohm", tolerance = "5 %" })",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      sheet.resistor(sheet.part(name, "load_resistor", plus, minus, Role::load), plus, minus,
                     v["resistance"]);
    }};

}  // namespace couplet
