// SPDX-License-Identifier: MIT
#include <cmath>

#include "models/pieces.h"

namespace couplet {

// Knots v_k = lowest q^k, k = 0 .. chords, q = (highest / lowest)^(1 / chords), joined by chords of i = P /
// v. A chord lies above the curve; its power, a parabola in v, is P at both knots and (1 + q)^2 / (4 q) P at
// the largest, half way between them: the power drawn is never too small and too large by at most (q - 1)^2 /
// (4 q). Eight chords over a range of five are 1.01 % off, sixteen 0.25 %: the error falls with the square of
// their number.
extern const PartKind load_power_kind = {
    "load_power",
    "a constant power between two voltages, by chords; a resistor below, a constant current above",
    {{"across", "positive and negative node"}},
    {{"power", "W", "power drawn", "", 1e-12, 1e9},
     {"lowest", "V", "below this voltage it is a resistor", "", 1e-6, 1e6},
     {"highest", "V", "above this voltage the current stays", "", 1e-6, 1e6},
     {"chords", "1",
      "pieces of the curve; the power is off by at most (q-1)^2/(4q), q = (highest/lowest)^(1/chords)", "8",
      1, 24, false, Key::Type::count}},
    two_terminal_ratings(),
    R"(kind = "load_power"
across = ["rail", "gnd"]
power = "3 W"
lowest = "4 V"
highest = "20 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      Branch& b = sheet.branch(sheet.part(name, "load_power", plus, minus, Role::load), name, plus, minus);
      const int chords = static_cast<int>(v["chords"]);
      const double power = v["power"], q = std::pow(v["highest"] / v["lowest"], 1.0 / chords);
      const auto knot = [&](int k) { return k == chords ? v["highest"] : v["lowest"] * std::pow(q, k); };
      // Condition k: the voltage lies above knot k. Knots are in order, but the law must say what any
      // combination of bits means: the lowest clear bit decides.
      const auto first_clear = [](int k) { return std::pair{(2U << k) - 1, (1U << k) - 1}; };
      for (int k = 0; k <= chords; ++k) {
        Condition above;
        above.form.volt(plus, minus).add(-knot(k));
        b.conditions.push_back(above);
      }
      b.cells.push_back({"resistor", 1, 0, Form().volt(plus, minus, power / (knot(0) * knot(0)))});
      for (int k = 0; k < chords; ++k) {
        const double slope = -power / (knot(k) * knot(k + 1));
        const auto [mask, value] = first_clear(k + 1);
        b.cells.push_back(
            {"draws", mask, value, Form().volt(plus, minus, slope).add(power / knot(k) - slope * knot(k))});
      }
      const std::uint32_t all = (2U << chords) - 1;
      b.cells.push_back({"holds", all, all, Form().add(power / knot(chords))});
    },
    [](const Values& v) -> std::string {
      if (v["highest"] <= v["lowest"]) return "highest must lie above lowest; raise it";
      return {};
    }};

}  // namespace couplet
