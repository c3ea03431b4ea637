// SPDX-License-Identifier: MIT
// Resistor, capacitor, coil, ideal transformer.
#include "models/kinds.h"
#include "models/pieces.h"

namespace couplet {

const PartKind resistor_kind = {
    "resistor",
    "a linear resistor",
    {{"across", "the two nodes"}},
    {{"resistance", "ohm", "resistance", "", 1e-12, 1e18}},
    two_terminal_ratings(),
    "kind = \"resistor\"\nacross = [\"gate_left\", \"gnd\"]\nresistance = \"10 kohm\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      sheet.resistor(sheet.part(name, "resistor", n.at("across.0"), n.at("across.1")), n.at("across.0"),
                     n.at("across.1"), v["resistance"]);
    }};

const PartKind capacitor_kind = {
    "capacitor",
    "a linear capacitor with its series resistance",
    {{"across", "the two nodes"}},
    {{"capacitance", "F", "capacitance at the working voltage", "", 1e-18, 1e3},
     {"resistance", "ohm", "equivalent series resistance; 0: none", "0 ohm", 0, 1e9},
     {"start", "V", "voltage at time zero", "0 V", -1e6, 1e6, false}},
    two_terminal_ratings(),
    "kind = \"capacitor\"\nacross = [\"left\", \"right\"]\ncapacitance = { value = \"100 nF\", tolerance = "
    "\"5 %\" }\nresistance = \"8 mohm\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "capacitor", plus, minus);
      if (v["resistance"] > 0) {
        const Node inside = sheet.inner(part, "inside");
        sheet.resistor(part, plus, inside, v["resistance"]);
        sheet.capacitor(part, inside, minus, v["capacitance"], v["start"]);
      } else {
        sheet.capacitor(part, plus, minus, v["capacitance"], v["start"]);
      }
    }};

const PartKind coil_kind = {
    "coil",
    "an inductor with its winding resistance; couplings name it",
    {{"across", "the two nodes; the first is the dotted end"}},
    {{"inductance", "H", "inductance as built in, shield and neighbours in place", "", 1e-15, 1e6},
     {"resistance", "ohm", "winding resistance at the working frequency", "0 ohm", 0, 1e9},
     {"start", "A", "current at time zero", "0 A", -1e6, 1e6, false}},
    two_terminal_ratings(),
    "kind = \"coil\"\nacross = [\"left\", \"right\"]\ninductance = \"10 uH\"\nresistance = \"60 mohm\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "coil", n.at("across.0"), n.at("across.1"));
      sheet.coil(part, n.at("across.0"), n.at("across.1"), v["inductance"], v["resistance"], v["start"]);
    }};

const PartKind transformer_kind = {
    "transformer",
    "an ideal transformer: no leakage, no magnetising current",
    {{"first", "list of the two nodes of the first winding"},
     {"second", "list of the two nodes of the second winding"}},
    {{"ratio", "1", "voltage of the first winding over that of the second", "1", 1e-9, 1e9}},
    {},
    "kind = \"transformer\"\nfirst = [\"a\", \"b\"]\nsecond = [\"c\", \"gnd\"]\nratio = \"2\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "transformer", n.at("first.0"), n.at("first.1"));
      Transformer t;
      t.part = part;
      t.name = name;
      t.a = n.at("first.0"), t.b = n.at("first.1"), t.c = n.at("second.0"), t.d = n.at("second.1");
      t.ratio = v["ratio"];
      sheet.transformers.push_back(t);
    }};

}  // namespace couplet
