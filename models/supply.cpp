// SPDX-License-Identifier: MIT
#include "models/pieces.h"
#include "models/shape.h"

namespace couplet {
namespace {

// Beyond its limit the supply is a current source with this share of its own conductance left. It keeps a
// coil in series from being cut off from every voltage, and takes from the limit a millionth of what a short
// circuit would add.
constexpr double leftover = 1e-6;

}  // namespace

extern const PartKind supply_kind = {
    "supply",
    "a voltage source with series resistance, and inductance and current limit where given",
    {{"across", "positive and negative node"}},
    joined(shape_keys("voltage", "V"),
           {{"resistance", "ohm", "series resistance", "10 mohm", 1e-9, 1e9},
            {"inductance", "H", "series inductance; 0: none", "0 H", 0, 1e3},
            {"current_limit", "A", "largest current it delivers", "-", 1e-12, 1e9}}),
    two_terminal_ratings(),
    R"(kind = "supply"
across = ["vin", "gnd"]
voltage = "12 V"
resistance = "50 mohm"
rise = "200 us"
current_limit = "3 A")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "supply", plus, minus, Role::source);
      const Form value = shape_value(sheet, v, "voltage");
      const double g = 1 / v["resistance"];
      Node top = plus;
      if (v["inductance"] > 0) {
        top = sheet.inner(part, "inside");
        sheet.coil(part, top, plus, v["inductance"], 0, 0);
      }
      Branch& b = sheet.branch(part, name, top, minus);
      b.has_emf = true;
      b.emf = value;
      Form normal;
      normal.volt(top, minus, g).plus(value, -g);
      if (!v.has("current_limit")) {
        b.cells = {{"supplies", 0, 0, normal}};
        return;
      }
      Condition below;  // the current drawn lies below the limit
      below.form.plus(normal).add(v["current_limit"]);
      b.conditions = {below};
      Form limited;
      limited.add(-v["current_limit"]);
      if (v["inductance"] > 0) limited.plus(below.form, leftover);
      b.cells = {{"limits", 1, 0, limited}, {"supplies", 1, 1, normal}};
    },
    [](const Values& v) { return check_shape(v, "voltage"); }};

}  // namespace couplet
