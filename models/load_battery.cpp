// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind load_battery_kind = {
    "load_battery",
    "a battery: electromotive force and internal resistance",
    {{"across", "positive and negative node"}},
    {{"voltage", "V", "open-circuit voltage", "", 0, 1e6},
     {"resistance", "ohm", "internal resistance", "0.1 ohm", 1e-9, 1e6}},
    two_terminal_ratings(),
    R"(kind = "load_battery"
across = ["pack", "gnd"]
voltage = "10.8 V"
resistance = "150 mohm")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      Branch& b = sheet.branch(sheet.part(name, "load_battery", plus, minus, Role::load), name, plus, minus);
      b.has_emf = true;
      b.emf.add(v["voltage"]);
      const double g = 1 / v["resistance"];
      b.cells = {{"", 0, 0, Form().volt(plus, minus, g).add(-g * v["voltage"])}};
    }};

}  // namespace couplet
