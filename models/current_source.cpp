// SPDX-License-Identifier: MIT
#include "models/pieces.h"
#include "models/shape.h"

namespace couplet {

extern const PartKind current_source_kind = {
    "current_source",
    "a current source with a parallel resistance",
    {{"across", "current leaves at the first node"}},
    joined(shape_keys("current", "A"), {{"resistance", "ohm", "parallel resistance", "1 Mohm", 1e-6, 1e15}}),
    two_terminal_ratings(),
    R"(kind = "current_source"
across = ["feed", "gnd"]
current = "2 A"
shape = "sine"
frequency = "140 kHz")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "current_source", plus, minus, Role::source);
      const Form value = shape_value(sheet, v, "current");
      Branch& b = sheet.branch(part, name, plus, minus);
      b.cells = {{"supplies", 0, 0, Form().plus(value, -1)}};
      sheet.resistor(part, plus, minus, v["resistance"]);
    },
    [](const Values& v) { return check_shape(v, "current"); }};

}  // namespace couplet
