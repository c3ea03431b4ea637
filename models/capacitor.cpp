// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind capacitor_kind = {
    "capacitor",
    "a linear capacitor with its series resistance",
    {{"across", "the two nodes"}},
    {{"capacitance", "F", "capacitance at the working voltage", "", 1e-18, 1e3},
     {"resistance", "ohm", "equivalent series resistance; 0: none", "0 ohm", 0, 1e9},
     {"start", "V", "voltage at time zero", "0 V", -1e6, 1e6, false}},
    two_terminal_ratings(),
    R"(kind = "capacitor"
across = ["left", "right"]
capacitance = { value = "100 nF", tolerance = "5 %" }
resistance = "8 mohm")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "capacitor", plus, minus);
      Node top = plus;
      if (v["resistance"] > 0) {
        top = sheet.inner(part, "inside");
        sheet.resistor(part, plus, top, v["resistance"]);
      }
      sheet.capacitor(part, top, minus, v["capacitance"], v["start"]);
    }};

}  // namespace couplet
