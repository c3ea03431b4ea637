// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind load_led_kind = {
    "load_led",
    "a light-emitting diode: drop and slope",
    {{"across", "anode and cathode"}},
    {{"forward_drop", "V", "voltage at which it begins to conduct", "2.8 V", 0, 1e4},
     {"on_resistance", "ohm", "slope beyond the drop", "1 ohm", 1e-9, 1e6},
     {"leakage", "ohm", "resistance below it", "1 Mohm", 1, 1e15}},
    two_terminal_ratings(),
    R"(kind = "load_led"
across = ["rail", "lamp"]
forward_drop = "3.0 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "load_led", n.at("across.0"), n.at("across.1"), Role::load);
      write_diode(sheet, part, name, n.at("across.0"), n.at("across.1"), diode_law(v));
    }};

}  // namespace couplet
