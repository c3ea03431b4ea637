// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind coil_kind = {
    "coil",
    "an inductor with its winding resistance; couplings name it",
    {{"across", "the two nodes; the first is the dotted end"}},
    {{"inductance", "H", "inductance as built in, shield and neighbours in place", "", 1e-15, 1e6},
     {"resistance", "ohm", "winding resistance at the working frequency", "0 ohm", 0, 1e9},
     {"start", "A", "current at time zero", "0 A", -1e6, 1e6, false}},
    two_terminal_ratings(),
    R"(kind = "coil"
across = ["left", "right"]
inductance = "10 uH"
resistance = "60 mohm")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "coil", plus, minus);
      sheet.coil(part, plus, minus, v["inductance"], v["resistance"], v["start"]);
    }};

}  // namespace couplet
