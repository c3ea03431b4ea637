// SPDX-License-Identifier: MIT
// Winding resistance against Bessel functions, Dowell's layers and their limits.
#include "models/coil/resistance.h"

#include "models/coil/self.h"
#include "tests/agrees.h"

using namespace couplet::coil;
using couplet::test::agrees;
using couplet::test::Tolerance;

namespace {

const double copper = 1.7241e-8;
const Tolerance digits{1e-11, 0, "the reference value is given to 12 digits"};

}  // namespace

TEST_CASE("copper and its skin depth", "[coil]") {
  // IEC 60028 (seen in texts on it): 1.7241e-8 ohm m at 20 degC, 0.00393 per K; R at 90 over R at 20
  // degC 1.2751.
  CHECK(copper_resistivity(20) == copper);
  CHECK(agrees(copper_resistivity(90) / copper_resistivity(20), 1.2751, {1e-12, 0, "arithmetic"}));
  const double depths[][2] = {{10e3, 660.8476616},
                              {100e3, 208.9783797},
                              {127.7e3, 184.929378},
                              {205e3, 145.9568315},
                              {1e6, 66.08476616}};
  for (const auto& d : depths)
    CHECK(agrees(skin_depth(d[0], copper), d[1] * 1e-6, {1e-9, 0, "given to 10 digits"}));
}

TEST_CASE("lone round wire: exact Bessel solution", "[coil]") {
  // Kelvin; Ramo, Whinnery, Van Duzer. Computed with 30 digits: d mm, f, Rac/Rdc, internal inductance nH/m.
  const double cases[][4] = {
      {0.5, 100e3, 1.04126549244, 48.9712790767}, {1, 100e3, 1.4498142827, 39.2202186348},
      {0.2, 125e3, 1.00170443662, 49.9573939317}, {1, 200e3, 1.96599067919, 29.0128212621},
      {2, 50e3, 1.96599067919, 29.0128212621},    {0.1, 1e6, 1.0067899909, 49.8303274097},
      {0.05, 1e6, 1.00042654529, 49.9893366711}};
  for (const auto& c : cases) {
    const double a = c[0] * 0.5e-3;
    const std::complex<double> z = round_wire(a, skin_depth(c[1], copper));
    CHECK(agrees(z.real(), c[2], digits));
    CHECK(agrees(z.imag() * copper / (pi * a * a) / (2 * pi * c[1]), c[3] * 1e-9, digits));
  }
  // Limits: dc, and a thick wire, where the current flows in a skin: a/(2 delta) + 1/4 + 3 delta/(32 a).
  CHECK(agrees(round_wire(1e-3, 1).real(), 1, {1e-12, 0, "(a/delta)^4/48"}));
  for (const double a : {50.0, 2000.0})
    CHECK(agrees(round_wire(a, 1).real(), a / 2 + 0.25 + 3 / (32 * a),
                 {2 / (a * a * a), 0, "next term of the asymptotic series"}));
}

TEST_CASE("round wire in a field across it", "[coil]") {
  // Low frequency: pi omega^2 B^2 d^4/(128 rho) for peak B (Ferreira, Sullivan). High: a perfect conductor,
  // J2/J0 -> -1.
  const double a = 0.05e-3, f = 20e3, depth = skin_depth(f, copper), omega = 2 * pi * f;
  const double power = -2 * pi * a * a * omega * mu0 * round_wire_across(a, depth).imag();  // per H^2 rms
  CHECK(agrees(power, pi * omega * omega * mu0 * mu0 * std::pow(2 * a, 4) / (64 * copper),
               {1e-3, 0, "next term (a/delta)^4 of the series, 1.3e-4 here times a factor of order one"}));
  CHECK(std::abs(round_wire_across(2000, 1) + 1.0) < 1e-3);
  // Passive at every frequency.
  for (double r = 1e-3; r < 1e3; r *= 1.3) CHECK(round_wire_across(r, 1).imag() < 0);
}

TEST_CASE("layers: Dowell", "[coil]") {
  const double cases[][3] = {{0.5, 1, 1.005542361775}, {1, 1, 1.08563570475},     {1, 3, 1.939964696492},
                             {2, 4, 18.14122128715},   {0.3, 10, 1.089790575542}, {3, 1, 3.010135854087}};
  for (const auto& c : cases) CHECK(agrees(dowell(c[0], c[1]), c[2], digits));
  CHECK(agrees(dowell(0.00999, 5), dowell(0.01001, 5),
               {1e-9, 0, "series and closed form meet; the slope between is 1e-11"}));
  CHECK(agrees(dowell(400, 1), 400, {1e-12, 0, "skin depth alone"}));
}

TEST_CASE("litz in a window: the published sum, and Dowell's layers", "[coil]") {
  // n N strands in rows of square cells are layers of thickness h = d sqrt(pi)/2 with a porosity: m^2 x^4/9
  // for many layers. A round strand loses 3/4 of the square bar that layers make of it (pi d^4/64 against
  // h^4/12 at equal area).
  const double f = 100e3, d = 0.1e-3, b = 15e-3, n = 100, turns = 10;
  const double depth = skin_depth(f, copper), h = d * std::sqrt(pi) / 2;
  // q strands side by side in a row across the breadth, m rows: q m = n N.
  const double q = 50, m = n * turns / q, porosity = q * h / b, x = h * std::sqrt(porosity) / depth;
  const double layers = m * m * x * x * x * x / 9;
  CHECK(agrees(litz_in_window(f, copper, turns, n, d, b) - 1,
               layers * (pi / 64) / (std::pow(std::sqrt(pi) / 2, 4) / 12),
               {1e-12, 0, "the same law written twice"}));
  // The published values 1.4791 and 1.0262 in circulation carry 192 in place of 768, four times the loss of
  // pi omega^2 B^2 d^4/(128 rho); the excess over 1 is a quarter of theirs.
  CHECK(agrees(litz_in_window(100e3, copper, 10, 100, 0.1e-3, 15e-3) - 1, 0.4791489708 / 4,
               {1e-9, 0, "10 digits"}));
  CHECK(agrees(litz_in_window(100e3, copper, 10, 50, 0.07e-3, 11e-3) - 1, 0.02620571154 / 4,
               {1e-9, 0, "10 digits"}));
}

TEST_CASE("the computed field in a long solenoid is that of layers", "[coil]") {
  // Far longer than wide: H rises from 0 outside to N I/l inside, as Dowell's layers want. Wound close, so
  // that the ripple of single wires of one layer does not reach the next. Six layers of 272 turns.
  const int rows = 272;
  const double pitch = 0.55e-3;
  Winding w;
  w.shape = Shape::multilayer;
  w.layers = 6, w.turns = 6 * rows;
  w.conductor.diameter = 0.5e-3;
  w.pitch = pitch, w.outer_diameter = 0.022, w.layer_pitch = 0.55e-3;
  const Coil coil = build(w);
  const OwnField field = own_field(coil);
  const double full = 6 / pitch;
  for (int layer = 0; layer < 6; ++layer) {
    // Layer 0 is the outermost; at the middle of a wire half of its layer lies outside.
    CHECK(agrees(
        std::sqrt(field.along_axis[layer * rows + rows / 2]), full * (layer + 0.5) / 6,
        {0, 0.015 * full, "return flux 2 (R/l)^2 = 0.9 %, and the turn's own curvature left out, 0.4 %"}));
  }
  // R(f): Dowell for round wire as square bars, in the middle range of frequency.
  const double f = 20e3, depth = skin_depth(f, copper), h = 0.5e-3 * std::sqrt(pi) / 2;
  const double x = h * std::sqrt(h / pitch) / depth;
  const Resistance r(coil);
  const double ratio = r.at(f, 20).resistance / r.dc(20);
  CHECK(agrees(
      (ratio - 1) * 4 / 3, dowell(x, 6) - 1,
      {0.08, 0,
       "bars for wires (3/4 holds at low frequency only); the ends of the coil, one diameter in eight"}));
}

TEST_CASE("windings: dc, growth, and the sign of every change", "[coil]") {
  Winding w;
  w.turns = 10, w.outer_diameter = 0.044, w.inner_diameter = 0.0195, w.conductor.diameter = 1e-3;
  const Coil wire = build(w);
  const Resistance solid(wire);
  const double area = pi / 4 * 1e-6;
  CHECK(agrees(solid.dc(20), copper * 10 * pi * (0.043 + 0.0205) / 2 / area,
               {1e-12, 0, "mean turn times turns"}));
  CHECK(solid.at(0, 20).resistance == solid.dc(20));
  // A turn alone is a lone wire.
  Winding one = w;
  one.turns = 1;
  const Resistance lone(build(one));
  CHECK(agrees(lone.at(100e3, 20).resistance / lone.dc(20), 1.4498142827, digits));
  CHECK(agrees(lone.at(100e3, 20).inductance_change, (39.2202186348e-9 - 50e-9) * build(one).wire_length,
               {1e-9, 0, "10 digits after a difference"}));
  // Litz of the same copper is better at 100 kHz and worse far above.
  Winding l = w;
  l.conductor.kind = Conductor::Kind::litz;
  l.conductor.strands = 100, l.conductor.diameter = 0.1e-3, l.conductor.bundle_diameter = 1.2e-3;
  l.turns = 9;
  const Resistance litz(build(l));
  CHECK(litz.at(100e3, 20).resistance / litz.dc(20) < 0.5 * solid.at(100e3, 20).resistance / solid.dc(20));
  CHECK(litz.at(10e6, 20).resistance / litz.dc(20) > solid.at(10e6, 20).resistance / solid.dc(20));
  // One turn of litz sits in its bundle's own field: with H^2 = I^2/(8 pi^2 b^2) on average and pi omega^2
  // B^2 d^4/(128 rho) a metre of strand for peak B, the growth is n^2 omega^2 mu0^2 d^6/(2048 rho^2 b^2),
  // besides that of the lone strand.
  l.turns = 1;
  const Resistance bundle(build(l));
  const double f = 30e3, growth = 100 * 2 * pi * f * mu0 * std::pow(0.1e-3, 3) / (copper * 0.6e-3);
  const double strand = round_wire(0.05e-3, skin_depth(f, copper)).real();
  CHECK(agrees(bundle.at(f, 20).resistance / bundle.dc(20) - strand, growth * growth / 2048,
               {1e-3, 0, "next term (a/delta)^4 of the strand's series"}));
  // A ferrite sheet raises the field at the turns, and with it the loss.
  Plane sheet;
  sheet.permeability = 1000, sheet.distance = 0.3e-3;
  Surroundings around;
  around.behind_first = sheet;
  const Resistance backed(wire, images(around, wire, wire, {}, 1));
  CHECK(backed.at(100e3, 20).resistance > solid.at(100e3, 20).resistance);
  // Traces: thin ones at low frequency are dc, and R never falls with frequency nor L rises.
  Winding t = w;
  t.conductor.kind = Conductor::Kind::trace;
  t.conductor.width = 1e-3, t.conductor.thickness = 70e-6;
  const Resistance trace(build(t));
  CHECK(agrees(trace.at(100, 20).resistance, trace.dc(20), {1e-3, 0, "f^2 growth"}));
  for (const Resistance* r : {&solid, &litz, &trace, &backed}) {
    double resistance = r->dc(20), change = 1e-15;
    for (double rising = 1e3; rising < 2e7; rising *= 1.5) {
      const Impedance z = r->at(rising, 20);
      CHECK(z.resistance >= resistance);
      CHECK(z.inductance_change <= change + 1e-6 * std::abs(change) + 1e-13);
      resistance = z.resistance, change = z.inductance_change;
    }
  }
  CHECK_FALSE(trace.limits(1e6, 20).empty());
}
