// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind switch_kind = {
    "switch",
    "a switch that follows a fixed command",
    {{"across", "the two nodes"}},
    joined(
        command_keys(),
        {{"duty", "1", "share of the period it is closed, before dead_time is taken off", "0.5", 0, 1, false},
         {"phase", "1", "start of the closed time, as a share of the period", "0", -1e3, 1e3, false}}),
    two_terminal_ratings(),
    R"(kind = "switch"
across = ["drain", "gnd"]
frequency = "130 kHz"
duty = "0.5")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "switch", plus, minus);
      write_switch(sheet, part, name, plus, minus, command_of(v, v["duty"], v["phase"]), v["on_resistance"],
                   v["off_resistance"]);
    },
    [](const Values& v) { return check_dead_time(v, v["duty"]); }};

}  // namespace couplet
