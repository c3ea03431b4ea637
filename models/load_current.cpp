// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind load_current_kind = {
    "load_current",
    "a constant current that lets go below a voltage",
    {{"across", "positive and negative node"}},
    {{"current", "A", "current drawn", "", 1e-12, 1e6},
     {"lets_go", "V", "below this voltage the current falls in proportion", "1 V", 1e-6, 1e6}},
    two_terminal_ratings(),
    R"(kind = "load_current"
across = ["vout", "gnd"]
current = "0.5 A"
lets_go = "2.5 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "load_current", plus, minus, Role::load);
      write_draw(sheet, part, name, plus, minus, v["current"], v["lets_go"], {"lets go", "draws"});
    }};

}  // namespace couplet
