// SPDX-License-Identifier: MIT
// Diode, clamp, fet, commanded switch, and the blocks made of them.
#include "models/kinds.h"
#include "models/pieces.h"

namespace couplet {
namespace {

Command command_of(const Values& v, double duty, double phase) {
  Command c;
  c.frequency = v["frequency"];
  c.duty = duty;
  c.phase = phase;
  c.dead = v["dead_time"];
  return c;
}

const std::vector<Key> command_keys = {
    {"frequency", "Hz", "switching frequency", "", 1e-3, 1e12},
    {"dead_time", "s", "delay of each turn-on", "0 s", 0, 1, false},
    {"on_resistance", "ohm", "resistance while closed", "20 mohm", 1e-9, 1e6},
    {"off_resistance", "ohm", "resistance while open", "1 Mohm", 1, 1e15},
};

std::string check_dead_time(const Values& v) {
  const double share = v.has("duty") ? v["duty"] : 0.5;
  if (v["dead_time"] * v["frequency"] >= share)
    return "dead_time is longer than the on time; shorten it or lower the frequency";
  return {};
}

/// One leg between `high` and `low`: two switches, each with an antiparallel diode and an output capacitance.
void write_leg(Sheet& sheet, const std::string& name, Node high, Node middle, Node low, const Values& v,
               double phase) {
  const auto half = [&](const std::string& piece, Node top, Node bottom, double at) {
    const int part = sheet.part(name + "." + piece, "switch", top, bottom);
    write_switch(sheet, part, name + "." + piece, top, bottom, command_of(v, 0.5, at), v["on_resistance"],
                 v["off_resistance"]);
    write_diode(sheet, part, name + "." + piece + ".diode", bottom, top,
                {v["diode_drop"], v["diode_resistance"], v["off_resistance"]});
    write_capacitor(sheet, part, top, bottom, v["output_capacitance"]);
  };
  half("upper", high, middle, phase);
  half("lower", middle, low, phase + 0.5);
}

const std::vector<Key> leg_keys = {
    {"diode_drop", "V", "forward drop of the antiparallel diodes", "0.7 V", 0, 100},
    {"diode_resistance", "ohm", "slope of the antiparallel diodes", "20 mohm", 1e-9, 1e6},
    {"output_capacitance", "F", "capacitance across each switch", "200 pF", 0, 1},
};

/// Ratings of a block that bound its pieces of one kind.
std::vector<Rating> ratings_of(const std::string& piece) {
  auto ratings = two_terminal_ratings();
  for (auto& r : ratings) r.of = piece;
  return ratings;
}

}  // namespace

const PartKind diode_kind = {
    "diode",
    "a diode: drop and slope when it conducts, leakage when it blocks",
    {{"anode", "current enters here"}, {"cathode", "and leaves here"}},
    diode_keys(),
    two_terminal_ratings(),
    "kind = \"diode\"\nanode = \"gate_left\"\ncathode = \"right\"\nforward_drop = \"0.35 V\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "diode", n.at("anode"), n.at("cathode"));
      write_diode(sheet, part, name, n.at("anode"), n.at("cathode"), diode_law(v));
      write_capacitor(sheet, part, n.at("anode"), n.at("cathode"), v["capacitance"]);
    }};

const PartKind clamp_kind = {
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
     {"forward_drop", "V", "of the forward diode, one way only", "0.7 V", 0, 100},
     {"capacitance", "F", "taken as constant", "0 F", 0, 1}},
    two_terminal_ratings(),
    "kind = \"clamp\"\nacross = [\"rail\", \"gnd\"]\nbreakdown = \"18 V\"\nresistance = \"0.3 ohm\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node plus = n.at("across.0"), minus = n.at("across.1");
      const int part = sheet.part(name, "clamp", plus, minus);
      const double leak = 1 / v["leakage"], slope = 1 / v["resistance"];
      const double back = v.words.at("ways") == "both" ? v["breakdown"] : v["forward_drop"];
      Branch& b = sheet.branch(part, name, plus, minus);
      Condition over, under;
      over.form.volt(plus, minus).add(-v["breakdown"]);
      under.form.volt(plus, minus, -1).add(-back);
      b.conditions = {over, under};
      b.cells = {{"blocks", 3, 0, Form().volt(plus, minus, leak)},
                 {"clamps", 1, 1, Form().volt(plus, minus, leak + slope).add(-slope * v["breakdown"])},
                 {"clamps backward", 3, 2, Form().volt(plus, minus, leak + slope).add(slope * back)}};
      write_capacitor(sheet, part, plus, minus, v["capacitance"]);
    }};

const PartKind fet_kind = {
    "fet",
    "a field-effect transistor in three regions (off, saturated, on) with body diode and capacitances",
    {{"drain", "drain"}, {"gate", "gate"}, {"source", "source"}},
    fet_keys(),
    two_terminal_ratings(),
    "kind = \"fet\"\ndrain = \"left\"\ngate = \"gate_left\"\nsource = \"gnd\"\nthreshold = { value = \"2.0 "
    "V\", tolerance = \"20 %\" }",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "fet", n.at("drain"), n.at("source"));
      write_fet(sheet, part, name, n.at("drain"), n.at("gate"), n.at("source"), v);
    }};

const PartKind switch_kind = {
    "switch",
    "a switch that follows a fixed command",
    {{"across", "the two nodes"}},
    joined(command_keys,
           {{"duty", "1", "share of the period it is closed", "0.5", 0, 1, false},
            {"phase", "1", "start of the closed time, as a share of the period", "0", -1e3, 1e3, false}}),
    two_terminal_ratings(),
    "kind = \"switch\"\nacross = [\"drain\", \"gnd\"]\nfrequency = \"130 kHz\"\nduty = \"0.5\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "switch", n.at("across.0"), n.at("across.1"));
      write_switch(sheet, part, name, n.at("across.0"), n.at("across.1"),
                   command_of(v, v["duty"], v["phase"]), v["on_resistance"], v["off_resistance"]);
    },
    check_dead_time};

const PartKind half_bridge_kind = {
    "half_bridge",
    "block: two commanded switches in turn, with antiparallel diodes; pieces upper, lower",
    {{"high", "positive supply node"}, {"middle", "the driven node"}, {"low", "negative supply node"}},
    joined(command_keys, leg_keys),
    two_terminal_ratings(),
    "kind = \"half_bridge\"\nhigh = \"vin\"\nmiddle = \"drive\"\nlow = \"gnd\"\nfrequency = \"140 "
    "kHz\"\ndead_time = \"150 ns\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      write_leg(sheet, name, n.at("high"), n.at("middle"), n.at("low"), v, 0);
    },
    check_dead_time};

const PartKind full_bridge_kind = {
    "full_bridge",
    "block: two legs in opposition; pieces left.upper, left.lower, right.upper, right.lower",
    {{"high", "positive supply node"},
     {"left", "first driven node"},
     {"right", "second driven node"},
     {"low", "negative supply node"}},
    joined(joined(command_keys, leg_keys),
           {{"shift", "1", "delay of the right leg, as a share of the period", "0.5", 0, 1, false}}),
    two_terminal_ratings(),
    "kind = \"full_bridge\"\nhigh = \"vin\"\nleft = \"drive_a\"\nright = \"drive_b\"\nlow = "
    "\"gnd\"\nfrequency = \"110 kHz\"\ndead_time = \"200 ns\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      write_leg(sheet, name + ".left", n.at("high"), n.at("left"), n.at("low"), v, 0);
      write_leg(sheet, name + ".right", n.at("high"), n.at("right"), n.at("low"), v, v["shift"]);
    },
    check_dead_time};

const PartKind bridge_kind = {"bridge",
                              "block: four rectifier diodes; pieces upper_a, upper_b, lower_a, lower_b",
                              {{"ac_a", "first alternating node"},
                               {"ac_b", "second alternating node"},
                               {"plus", "positive output"},
                               {"minus", "negative output"}},
                              diode_keys(),
                              two_terminal_ratings(),
                              "kind = \"bridge\"\nac_a = \"pick_a\"\nac_b = \"pick_b\"\nplus = "
                              "\"rail\"\nminus = \"gnd\"\nforward_drop = \"0.4 V\"\ncapacitance = \"150 pF\"",
                              [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
                                const auto one = [&](const std::string& piece, Node anode, Node cathode) {
                                  const int part = sheet.part(name + "." + piece, "diode", anode, cathode);
                                  write_diode(sheet, part, name + "." + piece, anode, cathode, diode_law(v));
                                  write_capacitor(sheet, part, anode, cathode, v["capacitance"]);
                                };
                                one("upper_a", n.at("ac_a"), n.at("plus"));
                                one("upper_b", n.at("ac_b"), n.at("plus"));
                                one("lower_a", n.at("minus"), n.at("ac_a"));
                                one("lower_b", n.at("minus"), n.at("ac_b"));
                              }};

const PartKind push_pull_kind = {
    "push_pull",
    "block: a self-oscillating pair, each gate pulled up from the feed and pulled down through a diode by "
    "the other drain; "
    "pieces left_switch, right_switch, left_pull_up, right_pull_up, left_gate_diode, right_gate_diode, "
    "left_bleed, right_bleed",
    {{"left", "first drain"},
     {"right", "second drain"},
     {"feed", "node that pulls the gates up"},
     {"common", "source node"}},
    joined(fet_keys(),
           {{"mismatch", "V", "threshold of the right switch above that of the left", "20 mV", -10, 10},
            {"pull_up", "ohm", "gate pull-up", "470 ohm", 1e-3, 1e9},
            {"bleed", "ohm", "gate to source", "10 kohm", 1, 1e12},
            {"gate_diode_drop", "V", "forward drop of the cross diodes", "0.35 V", 0, 100},
            {"gate_diode_resistance", "ohm", "slope of the cross diodes", "0.3 ohm", 1e-9, 1e6}}),
    ratings_of("fet"),
    "kind = \"push_pull\"\nleft = \"left\"\nright = \"right\"\nfeed = \"vin\"\ncommon = \"gnd\"\nthreshold = "
    "\"2.0 V\"\nmismatch = \"20 mV\"",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const auto half = [&](const std::string& side, Node drain, Node other, double mismatch) {
        const int sw = sheet.part(name + "." + side + "_switch", "fet", drain, n.at("common"));
        const Node gate = sheet.node(name + "." + side + "_gate");
        Values own = v;
        own.numbers["threshold"] += mismatch;
        write_fet(sheet, sw, name + "." + side + "_switch", drain, gate, n.at("common"), own);
        const int up = sheet.part(name + "." + side + "_pull_up", "resistor", n.at("feed"), gate);
        sheet.resistor(up, n.at("feed"), gate, v["pull_up"]);
        const int diode = sheet.part(name + "." + side + "_gate_diode", "diode", gate, other);
        write_diode(sheet, diode, name + "." + side + "_gate_diode", gate, other,
                    {v["gate_diode_drop"], v["gate_diode_resistance"], v["leakage"]});
        const int bleed = sheet.part(name + "." + side + "_bleed", "resistor", gate, n.at("common"));
        sheet.resistor(bleed, gate, n.at("common"), v["bleed"]);
      };
      half("left", n.at("left"), n.at("right"), 0);
      half("right", n.at("right"), n.at("left"), v["mismatch"]);
    }};

}  // namespace couplet
