// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind full_bridge_kind = {
    "full_bridge",
    "block: two legs in opposition; pieces left.upper, left.lower, right.upper, right.lower",
    {{"high", "positive supply node"},
     {"left", "first driven node"},
     {"right", "second driven node"},
     {"low", "negative supply node"}},
    joined(joined(command_keys(), leg_keys()),
           {{"shift", "1", "delay of the right leg, as a share of the period", "0.5", 0, 1, false}}),
    two_terminal_ratings(),
    R"(kind = "full_bridge"
high = "vin"
left = "drive_a"
right = "drive_b"
low = "gnd"
frequency = "110 kHz"
dead_time = "200 ns")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      write_leg(sheet, name + ".left", n.at("high"), n.at("left"), n.at("low"), v, 0);
      write_leg(sheet, name + ".right", n.at("high"), n.at("right"), n.at("low"), v, v["shift"]);
    },
    [](const Values& v) { return check_dead_time(v, 0.5); }};

}  // namespace couplet
