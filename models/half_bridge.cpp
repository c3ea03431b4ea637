// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind half_bridge_kind = {
    "half_bridge",
    "block: two commanded switches in turn, with antiparallel diodes; pieces upper, lower",
    {{"high", "positive supply node"}, {"middle", "the driven node"}, {"low", "negative supply node"}},
    joined(command_keys(), leg_keys()),
    two_terminal_ratings(),
    R"(kind = "half_bridge"
high = "vin"
middle = "drive"
low = "gnd"
frequency = "140 kHz"
dead_time = "150 ns")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      write_leg(sheet, name, n.at("high"), n.at("middle"), n.at("low"), v, 0);
    },
    [](const Values& v) { return check_dead_time(v, 0.5); }};

}  // namespace couplet
