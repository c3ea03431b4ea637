// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind clamp_kind = {
    "clamp",
    "a voltage clamp: conducts beyond its breakdown, one way (a diode the other way) or both ways",
    {{"across", "the two nodes; the first is the positive one"}},
    {{"breakdown", "V", "voltage at which it begins to conduct", "", 1e-3, 1e6},
     {"resistance", "ohm", "slope beyond the breakdown", "0.5 ohm", 1e-9, 1e6},
     {"leakage", "ohm", "resistance below it", "1 Mohm", 1, 1e15},
     {"ways",
      "1",
      "one: a forward diode the other way; both: the same breakdown",
      "one",
      0,
      0,
      false,
      Key::Type::word,
      {"one", "both"}},
     {"forward_drop", "V", "drop of the forward diode (one way only)", "0.7 V", 0, 100},
     {"capacitance", "F", "taken as constant", "0 F", 0, 1}},
    two_terminal_ratings(),
    R"(kind = "clamp"
across = ["rail", "gnd"]
breakdown = "18 V"
resistance = "0.3 ohm")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "clamp", plus, minus);
      const double backward = v.words.at("ways") == "both" ? v["breakdown"] : v["forward_drop"];
      write_clamp(sheet, part, name, plus, minus, {v["breakdown"], backward, v["resistance"], v["leakage"]});
      write_capacitor(sheet, part, plus, minus, v["capacitance"]);
    }};

}  // namespace couplet
