// SPDX-License-Identifier: MIT
// Loads: resistor, constant current, constant power, battery, light-emitting diode.
#include <cmath>

#include "models/kinds.h"
#include "models/pieces.h"

namespace couplet {

const PartKind load_resistor_kind = {
    "load_resistor",
    "a resistor whose power counts as delivered",
    {{"across", "positive and negative node"}},
    {{"resistance", "ohm", "resistance", "", 1e-9, 1e18}},
    two_terminal_ratings(),
    "kind = \"load_resistor\"\nacross = [\"vout\", \"gnd\"]\nresistance = { given = \"load\" }",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "load_resistor", n.at("across.0"), n.at("across.1"), Role::load);
      sheet.resistor(part, n.at("across.0"), n.at("across.1"), v["resistance"]);
    }};

const PartKind load_current_kind = {
    "load_current",
    "a constant current that lets go below a voltage",
    {{"across", "positive and negative node"}},
    {{"current", "A", "current drawn", "", 1e-12, 1e6},
     {"lets_go", "V", "below this voltage the current falls in proportion", "1 V", 1e-6, 1e6}},
    two_terminal_ratings(),
    "kind = \"load_current\"\nacross = [\"vout\", \"gnd\"]\ncurrent = \"0.5 A\"\nlets_go = \"2.5 V\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      Branch& b = sheet.branch(sheet.part(name, "load_current", plus, minus, Role::load), name, plus, minus);
      Condition full;
      full.form.volt(plus, minus).add(-v["lets_go"]);
      b.conditions = {full};
      b.cells = {{"lets go", 1, 0, Form().volt(plus, minus, v["current"] / v["lets_go"])},
                 {"draws", 1, 1, Form().add(v["current"])}};
    }};

const PartKind load_power_kind = {
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
    "kind = \"load_power\"\nacross = [\"rail\", \"gnd\"]\npower = \"3 W\"\nlowest = \"4 V\"\nhighest = \"20 "
    "V\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      Branch& b = sheet.branch(sheet.part(name, "load_power", plus, minus, Role::load), name, plus, minus);
      const int chords = static_cast<int>(v["chords"]);
      const double power = v["power"], q = std::pow(v["highest"] / v["lowest"], 1.0 / chords);
      // Knots v_k = lowest q^k; condition k: v > v_k. Cell k: bits below k set, bit k clear.
      const auto knot = [&](int k) { return k == chords ? v["highest"] : v["lowest"] * std::pow(q, k); };
      for (int k = 0; k <= chords; ++k) {
        Condition above;
        above.form.volt(plus, minus).add(-knot(k));
        b.conditions.push_back(above);
      }
      b.cells.push_back({"resistor", 1, 0, Form().volt(plus, minus, power / (knot(0) * knot(0)))});
      for (int k = 0; k < chords; ++k) {
        const double slope = (power / knot(k + 1) - power / knot(k)) / (knot(k + 1) - knot(k));
        b.cells.push_back({"draws", 3U << k, 1U << k,
                           Form().volt(plus, minus, slope).add(power / knot(k) - slope * knot(k))});
      }
      b.cells.push_back({"limits", 1U << chords, 1U << chords, Form().add(power / knot(chords))});
      // Knots are in order, but the law must say what any combination of bits means: the lowest clear bit
      // decides.
      for (int k = 1; k <= chords; ++k) {
        b.cells[k].mask = (2U << k) - 1;
        b.cells[k].value = (1U << k) - 1;
      }
      b.cells[chords + 1].mask = b.cells[chords + 1].value = (2U << chords) - 1;
    },
    [](const Values& v) -> std::string {
      if (v["highest"] <= v["lowest"]) return "highest must lie above lowest; raise it";
      return {};
    }};

const PartKind load_battery_kind = {
    "load_battery",
    "a battery: electromotive force and internal resistance",
    {{"across", "positive and negative node"}},
    {{"voltage", "V", "open-circuit voltage", "", 0, 1e6},
     {"resistance", "ohm", "internal resistance", "0.1 ohm", 1e-9, 1e6}},
    two_terminal_ratings(),
    "kind = \"load_battery\"\nacross = [\"pack\", \"gnd\"]\nvoltage = \"10.8 V\"\nresistance = \"150 mohm\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      Branch& b = sheet.branch(sheet.part(name, "load_battery", plus, minus, Role::load), name, plus, minus);
      b.has_emf = true;
      b.emf.add(v["voltage"]);
      b.cells = {
          {"", 0, 0, Form().volt(plus, minus, 1 / v["resistance"]).add(-v["voltage"] / v["resistance"])}};
    }};

const PartKind load_led_kind = {
    "load_led",
    "a light-emitting diode: drop and slope",
    {{"across", "anode and cathode"}},
    {{"forward_drop", "V", "voltage at which it begins to conduct", "2.8 V", 0, 1e4},
     {"on_resistance", "ohm", "slope beyond the drop", "1 ohm", 1e-9, 1e6},
     {"leakage", "ohm", "resistance below it", "1 Mohm", 1, 1e15}},
    two_terminal_ratings(),
    "kind = \"load_led\"\nacross = [\"rail\", \"lamp\"]\nforward_drop = \"3.0 V\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "load_led", n.at("across.0"), n.at("across.1"), Role::load);
      write_diode(sheet, part, name, n.at("across.0"), n.at("across.1"),
                  {v["forward_drop"], v["on_resistance"], v["leakage"]});
    }};

}  // namespace couplet
