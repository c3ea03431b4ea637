// SPDX-License-Identifier: MIT
// What is special about each part, against its law as people write it down: here with min and max, in the
// catalogue with regions. The identity suite (catalogue.cpp) sees to what all parts share.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <set>

#include "tests/agrees.h"
#include "tests/models/identity.h"

using namespace couplet;
using namespace couplet::test;

namespace {

const Tolerance rounding{
    1e-9, 1e-9,
    "both sides are sums of a few terms of up to 1e4 A; 1e-9 is a thousand times their round-off"};

/// A part made from its example with some values changed, and the currents it draws.
struct Bench {
  Values values;
  Sheet sheet;

  explicit Bench(const std::string& kind, const std::map<std::string, double>& numbers = {},
                 const std::map<std::string, std::string>& words = {},
                 const std::set<std::string>& without = {}) {
    Faults faults;
    values = example_values(*find_kind(kind), faults);
    REQUIRE(faults.empty());
    for (const auto& [key, x] : numbers) values.numbers[key] = x;
    for (const auto& [key, word] : words) values.words[key] = word;
    for (const auto& key : without) values.numbers.erase(key);
    sheet = alone(*find_kind(kind), values);
  }

  const Branch& branch(const std::string& name) const {
    const auto found = std::find_if(sheet.branches.begin(), sheet.branches.end(),
                                    [&](const Branch& b) { return b.name == name; });
    REQUIRE(found != sheet.branches.end());
    return *found;
  }

  /// Current and cell of a branch at voltages by terminal; `held` are bits of conditions that voltages do not
  /// decide.
  std::pair<double, std::string> at(const Branch& b, const std::map<std::string, double>& volts,
                                    std::uint32_t held = 0, double wave = 0) {
    Point p;
    p.volts.assign(sheet.nodes.size(), 0);
    for (const auto& [node, v] : volts) p.volts[sheet.node(node)] = v;
    p.waves.assign(sheet.waveforms.size(), wave);
    p.amperes.assign(sheet.coils.size(), 0);
    std::uint32_t bits = held;
    for (std::size_t c = 0; c < b.conditions.size(); ++c) {
      if (!b.conditions[c].hysteresis && b.conditions[c].command < 0 && value(b.conditions[c].form, p) > 0)
        bits |= 1U << c;
    }
    const Cell& cell = b.cells[Circuit::match_cell(b, bits)];
    return {value(cell.current, p), cell.state};
  }
  double across(double v) { return at(branch("it"), {{"across.0", v}}).first; }
  std::string state(double v) { return at(branch("it"), {{"across.0", v}}).second; }

  std::set<std::string> parts() const {
    std::set<std::string> names;
    for (const auto& p : sheet.parts) names.insert(p.name);
    return names;
  }
};

std::string complaint(const std::string& kind, const std::map<std::string, double>& numbers,
                      const std::map<std::string, std::string>& words = {}) {
  Faults faults;
  Values values = example_values(*find_kind(kind), faults);
  for (const auto& [key, x] : numbers) values.numbers[key] = x;
  for (const auto& [key, word] : words) values.words[key] = word;
  return find_kind(kind)->check(values);
}

}  // namespace

TEST_CASE("fet: off, saturated, on, and the same backward") {
  Bench fet("fet", {{"threshold", 2}, {"transconductance", 10}, {"on_resistance", 0.02}, {"leakage", 1e6}});
  const Branch& channel = fet.branch("it");
  std::set<std::string> met;
  for (double gate = -5; gate <= 15; gate += 0.37) {
    for (double drain = -30; drain <= 30; drain += 0.53) {
      const double overdrive = std::max(0.0, gate - 2), most = 10 * overdrive;
      const auto [i, state] = fet.at(channel, {{"drain", drain + 7}, {"gate", gate + 7}, {"source", 7}});
      INFO("gate " << gate << ", drain " << drain << ", " << state);
      CHECK(agrees(i, std::clamp(drain / 0.02, -most, most) + drain / 1e6, rounding));
      met.insert(state);
    }
    // Small drain voltages, where the channel is a resistor.
    if (gate > 2.1) {
      const auto [i, state] = fet.at(channel, {{"drain", 0.01}, {"gate", gate}});
      CHECK(state == "on");
      CHECK(agrees(i, 0.5 + 1e-8, rounding));
    }
  }
  met.insert("on");
  CHECK(met == std::set<std::string>{"off", "saturated", "on", "saturated backward"});
}

TEST_CASE("fet: the leakage stated is the leakage of the whole part") {
  for (const std::string kind : {"fet", "half_bridge"}) {
    Bench part(kind);
    const bool fet = kind == "fet";
    const double stated = part.values[fet ? "leakage" : "off_resistance"];
    double i = 0;
    for (const auto& b : part.sheet.branches) {
      if (fet || b.name.rfind("it.upper", 0) == 0)
        i += (b.from == part.sheet.node(fet ? "drain" : "high") ? 1 : -1) *
             part.at(b, {{fet ? "drain" : "high", 10}}).first;
    }
    INFO(kind);
    CHECK(agrees(i, 10 / stated, {1e-12, 0, "one division"}));
  }
}

TEST_CASE("fet: body diode from source to drain, three capacitances, left out where zero") {
  Bench fet("fet", {{"body_drop", 0.7}, {"body_resistance", 0.02}, {"gate_drain", 0}});
  const Branch& body = fet.branch("it.body");
  CHECK(agrees(fet.at(body, {{"source", 1.7}}).first, 1 / 0.02, rounding));
  CHECK(fet.at(body, {{"drain", 100}}).first == 0);
  CHECK(fet.sheet.capacitors.size() == 2);
}

TEST_CASE("clamp: one way it is a diode backward, both ways it is odd") {
  const auto expected = [](double v, double back) {
    return v / 1e6 + (v > 18 ? (v - 18) / 0.3 : v < -back ? (v + back) / 0.3 : 0);
  };
  Bench one("clamp", {{"breakdown", 18}, {"resistance", 0.3}, {"forward_drop", 0.7}});
  Bench both("clamp", {{"breakdown", 18}, {"resistance", 0.3}}, {{"ways", "both"}});
  for (double v = -40; v <= 40; v += 0.31) {
    CHECK(agrees(one.across(v), expected(v, 0.7), rounding));
    CHECK(agrees(both.across(v), expected(v, 18), rounding));
    CHECK(agrees(both.across(-v), -both.across(v), rounding));
  }
  CHECK(both.state(-20) == "clamps backward");
}

TEST_CASE("supply: no more than its limit, also into a short circuit") {
  Bench supply("supply", {{"voltage", 12}, {"rise", 0}, {"resistance", 0.05}, {"current_limit", 3}});
  for (double v = -2; v <= 20; v += 0.07)
    CHECK(agrees(-supply.across(v), std::min(3.0, (12 - v) / 0.05), rounding));
  CHECK(supply.state(0) == "limits");
  CHECK(supply.state(11.9) == "supplies");
  Bench open("supply", {{"rise", 0}}, {}, {"current_limit"});
  CHECK(open.branch("it").conditions.empty());
}

TEST_CASE("supply: with a coil in series it can still limit") {
  // A coil whose current a source of current dictates has no state of its own: nothing would hold the node
  // between.
  Bench supply(
      "supply",
      {{"voltage", 12}, {"rise", 0}, {"resistance", 0.05}, {"current_limit", 3}, {"inductance", 1e-6}});
  const Sheet sheet = tied(supply.sheet);
  Sheet untied = supply.sheet;
  untied.resistor(untied.part("ties", "resistor", 1, 0), untied.node("across.0"), 0, 1);
  for (const char* node : {"across", "across.1"}) untied.resistor(1, untied.node(node), 0, 1);
  const Circuit circuit(untied);
  std::vector<std::uint8_t> cells(untied.branches.size(), 0);
  CHECK_NOTHROW(circuit.topology(cells));
  // What is left of its conductance adds a millionth of (12 V / 0.05 ohm - 3 A) at a short circuit.
  CHECK(agrees(-supply.at(supply.branch("it"), {}).first, 3 + 1e-6 * (240 - 3), rounding));
}

TEST_CASE("sources over time: rise, sine, pulses, table") {
  Bench rise("supply", {{"voltage", 12}, {"rise", 2e-4}, {"delay", 1e-4}});
  REQUIRE(rise.sheet.waveforms.size() == 1);
  const Circuit ramp(tied(rise.sheet));
  const auto at = [](const Circuit& c, double t) { return c.inputs_at(t)[c.input_of_waveform(0)]; };
  const Tolerance inputs{1e-12, 1e-12, "a few roundings of values of order ten"};
  CHECK(at(ramp, 0) == 0);
  CHECK(agrees(at(ramp, 2e-4), 6, inputs));
  CHECK(at(ramp, 1) == 12);

  // 2 V peak at 1 kHz from a quarter period on.
  Bench sine("supply", {{"voltage", 2}, {"rise", 0}, {"frequency", 1e3}, {"phase", 0.25}, {"offset", 5}},
             {{"shape", "sine"}});
  const Waveform& wave = sine.sheet.waveforms.at(0);
  CHECK(wave.offset == 5);
  CHECK(agrees(at(Circuit(tied(sine.sheet)), 0), 2, inputs));

  // Period 1 ms, duty 0.3 between the middles of edges of 0.1 ms: mean 0.3 x 5 + 0.7 x 1.
  Bench pulses("supply",
               {{"voltage", 5}, {"low", 1}, {"rise", 0}, {"frequency", 1e3}, {"duty", 0.3}, {"edge", 1e-4}},
               {{"shape", "pulses"}});
  CHECK(element_faults(pulses.sheet, "it").empty());
  const auto& points = pulses.sheet.waveforms.at(0).points;
  double area = 0;
  for (std::size_t i = 1; i < points.size(); ++i)
    area += 0.5 * (points[i].value + points[i - 1].value) * (points[i].time - points[i - 1].time);
  CHECK(agrees(area / 1e-3, 0.3 * 5 + 0.7 * 1, inputs));
  const Circuit train(tied(pulses.sheet));
  for (double t : {0.05e-3, 7.05e-3})
    CHECK(agrees(at(train, t), 3, {1e-9, 0, "7 ms less seven periods of 1 ms"}));

  // Any pulse train that is let through runs forward within its period.
  for (double duty : {0.0, 0.1, 0.5, 1.0}) {
    for (double share : {0.0, 0.1, 0.3, 0.5, 0.7}) {
      const std::map<std::string, double> numbers{
          {"voltage", 5}, {"rise", 0}, {"frequency", 1e3}, {"duty", duty}, {"edge", share * 1e-3}};
      const bool fits = share <= std::min(duty, 1 - duty);
      CHECK(complaint("supply", numbers, {{"shape", "pulses"}}).empty() == fits);
      if (fits) CHECK(element_faults(Bench("supply", numbers, {{"shape", "pulses"}}).sheet, "it").empty());
    }
  }

  Faults faults;
  Values table = example_values(*find_kind("supply"), faults);
  table.words["shape"] = "table";
  table.numbers["rise"] = 0;
  table.numbers.erase("voltage");
  const auto check = find_kind("supply")->check;
  CHECK(check(table) == "shape table needs points = [[time, value], ...]");
  table.tables["points"] = {{0, 12}, {1e-3, 12}, {1e-3, 6}};
  CHECK(check(table).empty());
  const Circuit dip(tied(alone(*find_kind("supply"), table)));
  CHECK(at(dip, 0.5e-3) == 12);
  CHECK(at(dip, 1e-3) == 6);
  table.tables["points"] = {{0, 12}, {1e-3, 12}, {0.5e-3, 6}};
  CHECK(check(table) == "the times of points go backwards; sort them");
}

TEST_CASE("sources: a key that the shape does not read is refused, not dropped") {
  CHECK(complaint("supply", {{"frequency", 1e5}}) ==
        "shape steady does not read frequency; leave it out or choose another shape");
  CHECK(complaint("supply", {}, {{"shape", "sine"}}) ==
        "shape sine does not read rise; leave it out or choose another shape");
  CHECK(complaint("supply", {{"rise", 0}}, {{"shape", "sine"}}) ==
        "shape sine needs a frequency; add frequency");
  Faults faults;
  Values values = example_values(*find_kind("supply"), faults);
  values.numbers.erase("voltage");
  CHECK(find_kind("supply")->check(values) == "shape steady needs voltage; add it");
}

TEST_CASE("current source: current leaves at the first node, less what its resistance takes") {
  Bench source("current_source", {{"current", 2}, {"frequency", 0}, {"resistance", 100}},
               {{"shape", "steady"}});
  double enters = 0;
  for (const auto& b : source.sheet.branches) enters += source.at(b, {{"across.0", 10}}).first;
  CHECK(agrees(enters, -2 + 0.1, rounding));
}

TEST_CASE("regulator: sets, drops out, limits, idles; nothing flows back") {
  Bench part(
      "regulator",
      {{"output_voltage", 5}, {"dropout", 0.3}, {"resistance", 0.02}, {"current_limit", 2}, {"turn_on", 0}});
  const Branch& pass = part.branch("it");
  std::set<std::string> met;
  for (double in = 0; in <= 12; in += 0.1) {
    for (double load = -0.02; load <= 0.06; load += 0.0043) {
      const double aim = std::min(5.0, in - 0.3), out = aim - load;
      const auto [i, state] = part.at(pass, {{"input", in + 3}, {"output", out + 3}, {"common", 3}});
      INFO("input " << in << ", output " << out << ", " << state);
      CHECK(agrees(i, std::clamp(load / 0.02, 0.0, 2.0), rounding));
      met.insert(state);
    }
  }
  CHECK(met == std::set<std::string>{"regulates", "drops out", "limits", "idle"});
  const SheetPart& me = part.sheet.parts.at(0);
  CHECK(part.sheet.nodes[me.input] == "input");
  CHECK(part.sheet.nodes[me.output] == "output");
  CHECK(me.dropout == 0.3);
  CHECK(me.output_voltage == 5);
}

TEST_CASE(
    "regulator: starts at one input voltage, stops at a lower one; draws its own current through zero") {
  Bench part("regulator", {{"turn_on", 6}, {"turn_off", 5}, {"quiescent", 2e-3}});
  const Branch& pass = part.branch("it");
  const Condition& enabled = pass.conditions.back();
  REQUIRE(enabled.hysteresis);
  Point p;
  p.volts.assign(part.sheet.nodes.size(), 0);
  const auto is = [&](const Form& form, double in) {
    return p.volts[part.sheet.node("input")] = in, value(form, p) > 0;
  };
  CHECK((!is(enabled.form, 5.99) && is(enabled.form, 6.01)));
  CHECK((!is(enabled.held, 4.99) && is(enabled.held, 5.01)));
  CHECK_FALSE(enabled.start);
  CHECK(part.at(pass, {{"input", 12}}).second == "disabled");
  CHECK(part.at(pass, {{"input", 12}}).first == 0);
  CHECK(part.at(pass, {{"input", 12}}, 1U << 5).second == "limits");
  const Branch& own = part.branch("it.quiescent");
  for (double in : {-1.0, 0.0, 0.25, 0.5, 30.0})
    CHECK(agrees(part.at(own, {{"input", in}}).first, 2e-3 * std::min(1.0, in / 0.5), rounding));
  CHECK(complaint("regulator", {{"turn_on", 5}, {"turn_off", 5}}) ==
        "turn_off must lie below turn_on; lower it");
}

TEST_CASE("constant power: never too little, too much by (q-1)^2/(4q) at most, and by just that somewhere") {
  for (int chords : {1, 4, 8, 24}) {
    Bench load("load_power", {{"power", 3}, {"lowest", 4}, {"highest", 20}, {"chords", chords}});
    const double q = std::pow(5, 1.0 / chords), bound = (q - 1) * (q - 1) / (4 * q);
    double worst = 0, least = 0;
    for (double v = 4; v <= 20; v += 1e-3) {
      const double off = v * load.across(v) / 3 - 1;
      worst = std::max(worst, off), least = std::min(least, off);
    }
    INFO(chords << " chords");
    CHECK(least > -1e-12);
    CHECK(agrees(
        worst, bound,
        {1e-5, 1e-12, "the parabola's top is met within 0.5 mV, a ten-thousandth of a chord's width"}));
    CHECK(agrees(load.across(2), 2 * 3 / 16.0, rounding));  // a resistor of lowest^2 / power below
    CHECK(agrees(load.across(40), 3 / 20.0, rounding));     // a constant current above
  }
  CHECK(complaint("load_power", {{"highest", 4}}) == "highest must lie above lowest; raise it");
}

TEST_CASE("other loads") {
  Bench current("load_current", {{"current", 0.5}, {"lets_go", 2.5}});
  for (double v : {-1.0, 0.0, 1.0, 2.5, 9.0})
    CHECK(agrees(current.across(v), 0.5 * std::min(1.0, v / 2.5), rounding));
  Bench battery("load_battery", {{"voltage", 10.8}, {"resistance", 0.15}});
  for (double v : {0.0, 10.8, 12.0}) CHECK(agrees(battery.across(v), (v - 10.8) / 0.15, rounding));
  CHECK(battery.branch("it").has_emf);
  Bench lamp("load_led", {{"forward_drop", 3}, {"on_resistance", 2}});
  for (double v : {-1.0, 2.0, 5.0})
    CHECK(agrees(lamp.across(v), v / 1e6 + std::max(0.0, v - 3) / 2, rounding));
  for (const auto& kind : catalogue()) {
    Faults faults;
    if (kind.kind.rfind("load_", 0) != 0) continue;
    INFO(kind.kind);
    for (const auto& p : alone(kind, example_values(kind, faults)).parts) CHECK(p.role == Role::load);
  }
}

TEST_CASE("capacitor and coil: what is zero is left out") {
  CHECK(Bench("capacitor", {{"resistance", 0}}).sheet.branches.empty());
  Bench lossy("capacitor", {{"resistance", 0.008}, {"start", 3}});
  CHECK(agrees(lossy.at(lossy.branch("it"), {{"across.0", 0.008}}).first, 1, rounding));
  CHECK(lossy.sheet.nodes.back() == "it.inside");
  CHECK(lossy.sheet.capacitors.at(0).start == 3);
  Bench coil("coil", {{"start", 2}});
  CHECK(coil.sheet.coils.at(0).start == 2);
  CHECK(coil.sheet.branches.empty());
}

TEST_CASE("bridge: four diodes, each the way a rectifier has it") {
  Bench bridge("bridge", {{"leakage", 1e15}, {"forward_drop", 0}, {"on_resistance", 1}});
  CHECK(bridge.parts() == std::set<std::string>{"it.upper_a", "it.upper_b", "it.lower_a", "it.lower_b"});
  // The alternating nodes at +-1 V, both outputs at 0: one upper and one lower diode conduct.
  for (double v : {1.0, -1.0}) {
    double plus = 0, minus = 0;
    for (const auto& b : bridge.sheet.branches) {
      const double i = bridge.at(b, {{"ac_a", v}, {"ac_b", -v}}).first;
      plus += b.to == bridge.sheet.node("plus") ? i : 0;
      minus += b.from == bridge.sheet.node("minus") ? i : 0;
    }
    CHECK(agrees(plus, 1, rounding));
    CHECK(agrees(minus, 1, rounding));
  }
}

TEST_CASE("half and full bridge: halves in turn, dead time at each turn-on, never both closed") {
  Bench half("half_bridge", {{"frequency", 1e5}, {"dead_time", 5e-7}});
  Bench full("full_bridge", {{"frequency", 1e5}, {"dead_time", 5e-7}, {"shift", 0.5}});
  CHECK(half.parts() == std::set<std::string>{"it.upper", "it.lower"});
  CHECK(full.parts() ==
        std::set<std::string>{"it.left.upper", "it.left.lower", "it.right.upper", "it.right.lower"});
  const Circuit one(tied(half.sheet)), two(tied(full.sheet));
  double upper = 0, lower = 0;
  const int n = 1000;
  for (int k = 0; k < n; ++k) {
    const double t = 3e-5 + 1e-5 * (k + 0.5) / n;
    const bool u = one.command_bit(0, t), l = one.command_bit(1, t);
    CHECK_FALSE((u && l));
    upper += u, lower += l;
    // Opposite corners of the full bridge close together.
    CHECK(two.command_bit(0, t) == two.command_bit(3, t));
    CHECK(two.command_bit(1, t) == two.command_bit(2, t));
  }
  const Tolerance sampled{0, 1.0 / n, "one sample of the thousand may fall either way"};
  CHECK(agrees(upper / n, 0.45, sampled));
  CHECK(agrees(lower / n, 0.45, sampled));
  CHECK(complaint("half_bridge", {{"frequency", 1e5}, {"dead_time", 5e-6}}) ==
        "dead_time is longer than the on time; shorten it or lower the frequency");
  CHECK(complaint("switch", {{"duty", 0}, {"dead_time", 0}}).empty());  // a switch that never closes
}

TEST_CASE("push-pull: pieces under names that can be followed, halves that differ") {
  Bench pair("push_pull", {{"mismatch", 0.05}, {"pull_up", 470}, {"pull_up_mismatch", 0.1}}, {},
             {"gate_clamp"});
  CHECK(pair.parts() == std::set<std::string>{"it.left_switch", "it.right_switch", "it.left_pull_up",
                                              "it.right_pull_up", "it.left_gate_diode", "it.right_gate_diode",
                                              "it.left_bleed", "it.right_bleed"});
  const auto threshold = [&](const std::string& side) {
    return -pair.branch("it." + side + "_switch").conditions[0].form.constant;
  };
  CHECK(agrees(threshold("right") - threshold("left"), 0.05, rounding));
  CHECK(agrees(pair.at(pair.branch("it.left_pull_up"), {{"feed", 1}}).first, 1 / 470.0, rounding));
  CHECK(agrees(pair.at(pair.branch("it.right_pull_up"), {{"feed", 1}}).first, 1 / 517.0, rounding));
  // Each gate's diode points to the other drain.
  CHECK(pair.sheet.nodes[pair.branch("it.left_gate_diode").to] == "right");
  CHECK(pair.sheet.nodes[pair.branch("it.right_gate_diode").to] == "left");
  CHECK(pair.sheet.nodes[pair.branch("it.left_gate_diode").from] == "it.left_gate");

  Bench clamped("push_pull", {{"gate_clamp", 15}, {"gate_clamp_resistance", 2}});
  CHECK(clamped.parts().count("it.right_gate_clamp") == 1);
  CHECK(agrees(clamped.at(clamped.branch("it.left_gate_clamp"), {{"it.left_gate", 17}}).first, 1, rounding));
}

TEST_CASE("transformer: voltages by the ratio, power passes") {
  Bench part("transformer", {{"ratio", 2}});
  const Transformer& t = part.sheet.transformers.at(0);
  CHECK(t.ratio == 2);
  CHECK(part.sheet.nodes[t.a] == "first.0");
  CHECK(part.sheet.nodes[t.d] == "second.1");
}
