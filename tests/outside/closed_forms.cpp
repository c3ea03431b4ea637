// SPDX-License-Identifier: MIT
// The engine against closed forms and published circuits. Values marked "computed" were evaluated from the stated formula or as
// the exact solution of the stated circuit with 30-digit arithmetic.
#include <catch2/catch.hpp>
#include <cmath>

#include "engine/march/exact.h"
#include "engine/study/steady_state.h"
#include "tests/agrees.h"

using namespace couplet;
using couplet::test::agrees;

namespace {

double node_after(const Sheet& sheet, const std::string& node, double time, bool ida = false, double relative = 1e-10) {
  const Circuit circuit(sheet);
  MarchSettings settings;
  settings.relative = relative;
  const auto march = ida ? ida_march(circuit, settings) : exact_march(circuit, settings);
  MarchState state = march->stand(circuit.start_state(), 0);
  REQUIRE(march->run(state, time, nullptr).usable());
  const Eigen::VectorXd w = circuit.topology(state.cells).C * state.x;
  for (std::size_t n = 1; n < sheet.nodes.size(); ++n) {
    if (sheet.nodes[n] == node) return w[circuit.row_of_node(static_cast<Node>(n))];
  }
  FAIL("no such node");
  return 0;
}

Sheet series_rlc(double R, double L, double C, double V0) {
  Sheet sheet;
  const Node a = sheet.node("a");
  sheet.coil(sheet.part("coil", "coil", a, 0), a, 0, L, R, 0);
  sheet.capacitor(sheet.part("capacitor", "capacitor", a, 0), a, 0, C, V0);
  return sheet;
}

Orbit settle_by_probe(const Sheet& bare, const Form& form, double patience, std::unique_ptr<Circuit>& circuit, std::unique_ptr<Lapper>& lapper) {
  Section section;
  section.words = "the test's own";
  section.form = form;
  Sheet sheet = bare;
  sheet.probes.push_back({"section", form});
  circuit = std::make_unique<Circuit>(sheet);
  lapper = std::make_unique<Lapper>(*circuit, section, MarchSettings{});
  SettleOptions options;
  options.patience = patience;
  return settle(*lapper, options);
}

}  // namespace

TEST_CASE("series R L C ring-down, under- and overdamped", "[outside]") {
  // v(t) = V0 exp(-at)(cos wd t + a/wd sin wd t), a = R/2L, wd^2 = 1/LC - a^2 (elementary). Computed at 10 us.
  struct Row { double R, L, C, V0, v; };
  for (const auto& r : {Row{0.4, 24e-6, 100e-9, 10, 9.086109288108}, Row{1.2, 47e-6, 22e-9, 5, -4.061169328725}, Row{15, 10e-6, 100e-9, 5, 0.003634773151747},
                        Row{30, 10e-6, 100e-9, 5, 0.1284112202791}}) {
    CHECK(agrees(node_after(series_rlc(r.R, r.L, r.C, r.V0), "a", 10e-6), r.v, {1e-9, 1e-12, "the values are printed to 13 digits"}));
    CHECK(agrees(node_after(series_rlc(r.R, r.L, r.C, r.V0), "a", 10e-6, true), r.v, {1e-6, 1e-7, "IDA at 1e-10 a step"}));
  }
}

TEST_CASE("two coupled tanks with loss: the beat", "[outside]") {
  // Two tanks 24 uH, 100 nF, 0.2 ohm in series, k = 0.2, the first capacitor at 10 V; at 20 us (computed).
  Sheet sheet;
  const Node a = sheet.node("a"), b = sheet.node("b");
  const int first = sheet.coil(sheet.part("c1", "coil", a, 0), a, 0, 24e-6, 0.2, 0);
  const int second = sheet.coil(sheet.part("c2", "coil", b, 0), b, 0, 24e-6, 0.2, 0);
  sheet.capacitor(sheet.part("k1", "capacitor", a, 0), a, 0, 100e-9, 10);
  sheet.capacitor(sheet.part("k2", "capacitor", b, 0), b, 0, 100e-9, 0);
  sheet.couplings.push_back({first, second, 0.2 * 24e-6});
  CHECK(agrees(node_after(sheet, "a", 20e-6), 2.00791449651, {1e-9, 0, "printed to 12 digits"}));
  // The sign of the second depends on the winding's sense.
  CHECK(agrees(std::abs(node_after(sheet, "b", 20e-6)), 4.575963678812, {1e-9, 0, "printed to 13 digits"}));
}

TEST_CASE("bridge with capacitor filter and source resistance, nearly ideal diodes", "[outside]") {
  // Periodic solution, computed; compare O. H. Schade, Proc. IRE 31 (1943) 341. Rs is the supply's resistance.
  struct Row { const char *vp, *f, *rs, *c, *r; double mean, low, high, rms; };
  for (const auto& row : {Row{"10 V", "100 kHz", "0.5 ohm", "10 uF", "20 ohm", 8.89077534248, 8.81139541976, 8.96997750381, 0.88634890892},
                          Row{"12 V", "125 kHz", "2 ohm", "4.7 uF", "15 ohm", 8.52737869345, 8.39452839145, 8.65981723025, 0.886189884689}}) {
    double before = 1;
    for (const char* on : {"1e-3 ohm", "1e-5 ohm", "1e-7 ohm"}) {
      const std::string text = std::string("title = \"rectifier\"\nrail = \"rail\"\n[parts.source]\nkind = \"supply\"\nacross = [\"a\", \"b\"]\nshape = \"sine\"\nvoltage = \"") + row.vp +
                               "\"\nfrequency = \"" + row.f + "\"\nresistance = \"" + row.rs + "\"\n[parts.bridge]\nkind = \"bridge\"\nac_a = \"a\"\nac_b = \"b\"\nplus = \"rail\"\nminus = \"gnd\"\n" +
                               "forward_drop = \"0 V\"\non_resistance = \"" + on + "\"\nleakage = \"1e12 ohm\"\n[parts.filter]\nkind = \"capacitor\"\nacross = [\"rail\", \"gnd\"]\ncapacitance = \"" + row.c +
                               "\"\n[parts.load]\nkind = \"load_resistor\"\nacross = [\"rail\", \"gnd\"]\nresistance = \"" + row.r + "\"\n[run]\nduration = \"1 ms\"\n";
      const SteadyState s = run_settle(parse_netlist(text, "rectifier"));
      REQUIRE(s.orbit.found());
      const double off = std::abs(s.figures.value("rail.mean") / row.mean - 1);
      INFO(on);
      CHECK(off < before);  // the trend: ever nearer as the parts become ideal
      before = off;
      if (std::string(on) != "1e-7 ohm") continue;
      const test::Tolerance tolerance{1e-6, 0, "on-resistance 2e-7 of the source's, both diodes"};
      CHECK(agrees(s.figures.value("rail.mean"), row.mean, tolerance));
      CHECK(agrees(s.figures.value("rail.min"), row.low, tolerance));
      CHECK(agrees(s.figures.value("rail.max"), row.high, tolerance));
      CHECK(agrees(s.figures.value("source.current.rms"), row.rms, tolerance));
    }
  }
}

TEST_CASE("a tank with a three-segment conductor: limit cycle and multiplier", "[outside]") {
  // L = C = 1; the conductor draws -m v inside |v| < 1 and +p beyond, continuous. Computed from the pieces' closed forms;
  // the multiplier is exp(2 (m t_in - p t_out)) by Liouville's formula.
  struct Row { double m, p, period, multiplier; };
  for (const auto& row : {Row{0.3, 0.5, 6.328339891556744, 0.23875980306362}, Row{1, 1, 6.565817607830106, 0.040953288680285}, Row{0.1, 0.4, 6.294826830806122, 0.3666336560867}}) {
    Sheet sheet;
    const Node a = sheet.node("a");
    sheet.capacitor(sheet.part("c", "capacitor", a, 0), a, 0, 1, 0.1);
    sheet.coil(sheet.part("l", "coil", a, 0), a, 0, 1, 0, 0);
    Branch& b = sheet.branch(sheet.part("n", "conductor", a, 0), "n", a, 0);
    Condition above, below;
    above.form.volt(a, 0).add(-1);
    below.form.volt(a, 0, -1).add(-1);
    b.conditions = {above, below};
    b.cells = {{"inside", 3, 0, Form().volt(a, 0, -row.m)}, {"above", 1, 1, Form().volt(a, 0, row.p).add(-row.p - row.m)}, {"below", 3, 2, Form().volt(a, 0, row.p).add(row.p + row.m)}};
    std::unique_ptr<Circuit> circuit;
    std::unique_ptr<Lapper> lapper;
    const Orbit orbit = settle_by_probe(sheet, Form().volt(a, 0), 2000, circuit, lapper);
    INFO(orbit.sentence);
    REQUIRE(orbit.found());
    CHECK(agrees(orbit.period, row.period, {1e-9, 0, "closed form, 16 digits"}));
    CHECK(agrees(std::abs(orbit.multipliers.front()), row.multiplier, {1e-9, 0, "closed form, 13 digits"}));
    CHECK(orbit.trivial_error < 1e-9);
  }
}

TEST_CASE("two lossless tanks ring at f0 / sqrt(1 +- k)", "[outside]") {
  // Eigenvalues of the reduced circuit against the closed form (textbook; e.g. F. E. Terman, Radio Engineers' Handbook, 1943).
  Sheet sheet;
  const Node a = sheet.node("a"), b = sheet.node("b");
  const int first = sheet.coil(sheet.part("c1", "coil", a, 0), a, 0, 24e-6, 0, 0), second = sheet.coil(sheet.part("c2", "coil", b, 0), b, 0, 24e-6, 0, 0);
  sheet.capacitor(sheet.part("k1", "capacitor", a, 0), a, 0, 100e-9, 0);
  sheet.capacitor(sheet.part("k2", "capacitor", b, 0), b, 0, 100e-9, 0);
  sheet.couplings.push_back({first, second, 0.3 * 24e-6});
  const Circuit circuit(sheet);
  const Eigen::VectorXcd rates = circuit.topology({}).A.topLeftCorner(4, 4).eigenvalues();
  double low = 1e300, high = 0;
  for (int i = 0; i < 4; ++i) low = std::min(low, std::abs(rates[i].imag())), high = std::max(high, std::abs(rates[i].imag()));
  CHECK(agrees(low / (2 * M_PI), 90103.74346677, {1e-9, 0, "printed to 13 digits"}));
  CHECK(agrees(high / (2 * M_PI), 122790.7044105, {1e-9, 0, "printed to 13 digits"}));
}

TEST_CASE("step ceiling and fineness do not move the answer; IDA comes to it as its tolerance falls", "[outside]") {
  for (const char* name : {"dock", "crib", "buoy"}) {
    INFO(name);
    const Sheet sheet = build_sheet(read_netlist(std::string(COUPLET_SOURCE) + "/netlists/" + name + ".toml"));
    const auto march = [&](double ceiling, int fineness, double time, double relative = 0) {
      const Circuit circuit(sheet);
      MarchSettings settings;
      settings.step_ceiling = ceiling;
      settings.fineness = fineness;
      settings.relative = relative;
      const auto m = relative > 0 ? ida_march(circuit, settings) : exact_march(circuit, settings);
      MarchState state = m->stand(circuit.start_state(), 0);
      REQUIRE(m->run(state, time, nullptr).usable());
      CHECK(state.time == time);
      return Eigen::VectorXd(circuit.topology(state.cells).C * state.x);
    };
    for (double time : {0.3e-3, 3e-3}) {
      const Eigen::VectorXd wide = march(1.6e-6, 6, time), narrow = march(25e-9, 6, time), fine = march(1.6e-6, 10, time);
      const double size = wide.cwiseAbs().maxCoeff();
      CHECK((wide - narrow).cwiseAbs().maxCoeff() < 1e-8 * size);
      CHECK((wide - fine).cwiseAbs().maxCoeff() < 1e-8 * size);
    }
    const Eigen::VectorXd exact = march(1.6e-6, 6, 0.1e-3);
    const double coarse = (march(1e300, 6, 0.1e-3, 1e-5) - exact).cwiseAbs().maxCoeff(), tight = (march(1e300, 6, 0.1e-3, 1e-9) - exact).cwiseAbs().maxCoeff();
    CHECK(tight < coarse);
    CHECK(tight < 1e-5 * exact.cwiseAbs().maxCoeff());
  }
}
