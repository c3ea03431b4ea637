// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

void write_diode(Sheet& sheet, int part, const std::string& name, Node anode, Node cathode,
                 const DiodeLaw& law) {
  Branch& b = sheet.branch(part, name, anode, cathode);
  Condition conducts;
  conducts.form.volt(anode, cathode).add(-law.drop);
  b.conditions = {conducts};
  const double leak = 1 / law.leakage;
  b.cells = {{"blocks", 1, 0, Form().volt(anode, cathode, leak)},
             {"conducts", 1, 1, Form().volt(anode, cathode, leak + 1 / law.on).add(-law.drop / law.on)}};
}

void write_clamp(Sheet& sheet, int part, const std::string& name, Node plus, Node minus,
                 const ClampLaw& law) {
  Branch& b = sheet.branch(part, name, plus, minus);
  Condition over, under;
  over.form.volt(plus, minus).add(-law.breakdown);
  under.form.volt(plus, minus, -1).add(-law.backward);
  b.conditions = {over, under};
  const double leak = 1 / law.leakage, slope = 1 / law.slope;
  b.cells = {{"blocks", 3, 0, Form().volt(plus, minus, leak)},
             {"clamps", 1, 1, Form().volt(plus, minus, leak + slope).add(-slope * law.breakdown)},
             {"clamps backward", 3, 2, Form().volt(plus, minus, leak + slope).add(slope * law.backward)}};
}

void write_switch(Sheet& sheet, int part, const std::string& name, Node from, Node to, const Command& command,
                  double on, double off) {
  Condition commanded;
  commanded.command = sheet.command(command);
  Branch& b = sheet.branch(part, name, from, to);
  b.conditions = {commanded};
  b.cells = {{"open", 1, 0, Form().volt(from, to, 1 / off)}, {"closed", 1, 1, Form().volt(from, to, 1 / on)}};
}

void write_draw(Sheet& sheet, int part, const std::string& name, Node from, Node to, double current,
                double knee, std::pair<const char*, const char*> states) {
  Branch& b = sheet.branch(part, name, from, to);
  Condition full;
  full.form.volt(from, to).add(-knee);
  b.conditions = {full};
  b.cells = {{states.first, 1, 0, Form().volt(from, to, current / knee)},
             {states.second, 1, 1, Form().add(current)}};
}

void write_channel(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
                   const FetLaw& law) {
  Branch& b = sheet.branch(part, name, drain, source);
  const double gm = law.transconductance, leak = 1 / law.leakage;
  Condition above, below_forward, below_backward;
  above.form.volt(gate, source).add(-law.threshold);
  below_forward.form.volt(gate, source, gm).add(-gm * law.threshold).volt(drain, source, -1 / law.on);
  below_backward.form.volt(gate, source, gm).add(-gm * law.threshold).volt(drain, source, 1 / law.on);
  b.conditions = {above, below_forward, below_backward};
  const auto saturated = [&](double sign) {
    return Form().volt(gate, source, sign * gm).add(-sign * gm * law.threshold).volt(drain, source, leak);
  };
  b.cells = {{"off", 1, 0, Form().volt(drain, source, leak)},
             {"on", 7, 7, Form().volt(drain, source, 1 / law.on + leak)},
             {"saturated", 3, 1, saturated(1)},
             {"saturated backward", 7, 3, saturated(-1)}};
}

void write_capacitor(Sheet& sheet, int part, Node from, Node to, double farads) {
  if (farads > 0) sheet.capacitor(part, from, to, farads, 0);
}

void write_fet(Sheet& sheet, int part, const std::string& name, Node drain, Node gate, Node source,
               const Values& v) {
  write_channel(sheet, part, name, drain, gate, source,
                {v["threshold"], v["transconductance"], v["on_resistance"], v["leakage"]});
  // Its leakage is the channel's.
  write_diode(sheet, part, name + ".body", source, drain, {v["body_drop"], v["body_resistance"], never});
  write_capacitor(sheet, part, gate, source, v["gate_source"]);
  write_capacitor(sheet, part, gate, drain, v["gate_drain"]);
  write_capacitor(sheet, part, drain, source, v["drain_source"]);
}

void write_leg(Sheet& sheet, const std::string& name, Node high, Node middle, Node low, const Values& v,
               double phase) {
  const auto half = [&](const std::string& piece, Node top, Node bottom, double at) {
    const std::string full = name + "." + piece;
    const int part = sheet.part(full, "switch", top, bottom);
    write_switch(sheet, part, full, top, bottom, command_of(v, 0.5, at), v["on_resistance"],
                 v["off_resistance"]);
    write_diode(sheet, part, full + ".diode", bottom, top, {v["diode_drop"], v["diode_resistance"], never});
    write_capacitor(sheet, part, top, bottom, v["output_capacitance"]);
  };
  half("upper", high, middle, phase);
  half("lower", middle, low, phase + 0.5);
}

std::vector<Key> diode_keys() {
  return {
      {"forward_drop", "V", "voltage at which it begins to conduct", "0.4 V", 0, 1e3},
      {"on_resistance", "ohm", "slope beyond the drop", "50 mohm", 1e-9, 1e6},
      {"leakage", "ohm", "resistance while it blocks", "1 Mohm", 1, 1e15},
      {"capacitance", "F", "junction capacitance, taken as constant", "0 F", 0, 1},
  };
}

std::vector<Key> fet_keys() {
  return {
      {"threshold", "V", "gate voltage at which the channel begins to conduct", "2 V", -100, 100},
      {"transconductance", "S", "drain current gained for each volt of gate overdrive", "10 S", 1e-6, 1e5},
      {"on_resistance", "ohm", "channel resistance when fully on", "20 mohm", 1e-9, 1e6},
      {"leakage", "ohm", "drain-source resistance while off", "1 Mohm", 1, 1e15},
      {"body_drop", "V", "forward drop of the body diode", "0.7 V", 0, 100},
      {"body_resistance", "ohm", "slope of the body diode", "20 mohm", 1e-9, 1e6},
      {"gate_source", "F", "gate-source capacitance", "1 nF", 0, 1},
      {"gate_drain", "F", "gate-drain capacitance", "100 pF", 0, 1},
      {"drain_source", "F", "drain-source capacitance", "300 pF", 0, 1},
  };
}

std::vector<Key> command_keys() {
  return {
      {"frequency", "Hz", "switching frequency", "", 1e-3, 1e12},
      {"dead_time", "s", "delay of each turn-on", "0 s", 0, 1, false},
      {"on_resistance", "ohm", "resistance while closed", "20 mohm", 1e-9, 1e6},
      {"off_resistance", "ohm", "resistance while open", "1 Mohm", 1, 1e15},
  };
}

std::vector<Key> leg_keys() {
  return {
      {"diode_drop", "V", "forward drop of the antiparallel diodes", "0.7 V", 0, 100},
      {"diode_resistance", "ohm", "slope of the antiparallel diodes", "20 mohm", 1e-9, 1e6},
      {"output_capacitance", "F", "capacitance across each switch", "200 pF", 0, 1},
  };
}

DiodeLaw diode_law(const Values& v) { return {v["forward_drop"], v["on_resistance"], v["leakage"]}; }

Command command_of(const Values& v, double duty, double phase) {
  return {v["frequency"], duty, phase, v["dead_time"]};
}

std::string check_dead_time(const Values& v, double duty) {
  if (v["dead_time"] > 0 && v["dead_time"] * v["frequency"] >= duty)
    return "dead_time is longer than the on time; shorten it or lower the frequency";
  return {};
}

std::vector<Rating> two_terminal_ratings() {
  return {
      {"voltage", "V", "voltage.peak", "largest voltage across the part"},
      {"current", "A", "current.peak", "largest current"},
      {"current_rms", "A", "current.rms", "effective current"},
      {"power", "W", "loss", "mean loss"},
  };
}

std::vector<Rating> ratings_of(const std::string& piece) {
  auto ratings = two_terminal_ratings();
  for (auto& r : ratings) r.of = piece;
  return ratings;
}

std::vector<Key> joined(std::vector<Key> first, const std::vector<Key>& second) {
  first.insert(first.end(), second.begin(), second.end());
  return first;
}

}  // namespace couplet
