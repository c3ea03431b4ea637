// SPDX-License-Identifier: MIT
#include "engine/capture/inductance.h"

#include <Eigen/Dense>
#include <unsupported/Eigen/Polynomials>

#include "tests/agrees.h"
#include "tests/capture/synthetic.h"

namespace couplet::capture {
namespace {

using couplet::test::agrees;
using test::Chance;

/// The oscillating root of a polynomial with these coefficients, lowest power first: an outside solver
/// (eigenvalues of the companion matrix), so that the closed forms are not tested against themselves.
RingDownMode ring_of(const Eigen::VectorXd& coefficients) {
  Eigen::PolynomialSolver<double, Eigen::Dynamic> solver(coefficients);
  RingDownMode mode;
  for (const auto& root : solver.roots()) {
    if (root.imag() <= 0) continue;
    mode.frequency.value = root.imag() / (2 * std::numbers::pi);
    mode.damping = {-root.real(), -root.real(), -root.real()};
    mode.natural.value = std::abs(root) / (2 * std::numbers::pi);
  }
  return mode;
}

// The companion matrix spans five decades of coefficients scaled by time; its eigenvalues carry that many
// lost digits.
const couplet::test::Tolerance solved{1e-8, 0,
                                      "root of a polynomial by eigenvalues, about 1e-10, amplified by Q"};

TEST_CASE("inductance and resistance come back from the loop's own roots") {
  const double L = 24.3e-6, R = 0.21, C = 47e-9, probe = 12e-12, G = 1 / 10e6, series = 0.05;
  // Time in microseconds keeps the coefficients near one.
  const double c = C + probe;
  Eigen::VectorXd p(3);
  p << (1 + (R + series) * G) / (L * c) * 1e-12, ((R + series) / L + G / c) * 1e-6, 1;
  RingDownMode ring = ring_of(p);
  ring.frequency.value *= 1e6;
  ring.damping.value *= 1e6;
  const KnownCapacitor given{{C, 0.01 * C}, {probe, 3e-12}, {series, 0.01}, 10e6};
  const CoilReading reading = read_coil(ring, given);
  REQUIRE(reading.problem == "");
  CHECK(agrees(reading.inductance.value, L, solved));
  CHECK(agrees(reading.resistance.value, R, solved));
  CHECK(agrees(reading.quality.value, 2 * std::numbers::pi * ring.frequency.value * L / R, solved));
  // 1 % of capacitance is 1 % of inductance, to first order and with the probe's 3 pF.
  CHECK(agrees(reading.inductance.systematic.high / L - 1, 0.01 + 3.0e-12 / c,
               {0.02, 0, "second order of 1 %"}));
  CHECK(
      agrees(reading.resistance.systematic.high - R, 0.01 + (R + series) * 0.01, {0.03, 0, "second order"}));

  CHECK_THAT(read_coil(ring, {{C, 0}, {}, {1, 0}}).problem,
             Catch::Contains("less than the series resistance"));
  CHECK_THAT(read_coil(ring, {{C, C}, {}, {}}).problem, Catch::Contains("may be zero"));
}

TEST_CASE("ring-downs with and without the second coil give k and reflected resistance") {
  for (const double k : {0.02, 0.1, 0.3, 0.6, 0.9}) {
    for (const double R2 : {0.0, 0.2, 5.0, 40.0}) {
      const double L1 = 24e-6, L2 = 18e-6, R1 = 0.2, C = 47e-9;
      const double M2 = k * k * L1 * L2;
      // (R1 + s L1 + 1/(s C)) (R2 + s L2) - s^2 M^2 = 0, times s C; time in microseconds.
      Eigen::VectorXd closed(4);
      const double u = 1e-6;
      closed << R2, (L2 + R1 * C * R2) / u, (C * R1 * L2 + C * L1 * R2) / (u * u),
          C * (L1 * L2 - M2) / (u * u * u);
      Eigen::VectorXd alone(3);
      alone << 1, R1 * C / u, L1 * C / (u * u);
      closed /= closed[3];
      alone /= alone[2];
      RingDownMode with = ring_of(closed);
      RingDownMode without = ring_of(alone);
      for (RingDownMode* ring : {&with, &without}) {
        ring->frequency.value *= 1e6;
        ring->damping.value *= 1e6;
        ring->natural.value *= 1e6;
      }
      const CouplingReading reading = read_coupling(without, with, {{C, 0.02 * C}, {}, {}});
      INFO("k " << k << ", R2 " << R2 << " " << reading.problem);
      if (with.natural.value <= without.natural.value || with.frequency.value == 0) continue;
      REQUIRE(reading.problem == "");
      CHECK(agrees(reading.coupling.value, k,
                   {1e-6, 0, "difference of two close roots, 1/k^2 worse than a root"}));
      // The capacitor's tolerance is common to both readings and drops out.
      CHECK(reading.coupling.systematic.high - reading.coupling.systematic.low < 1e-9);
      if (R2 > 0) CHECK(reading.reflected_resistance.value > 0);
    }
  }
  const RingDownMode slow = ring_of(Eigen::Vector3d(1, 0.01, 1));
  RingDownMode fast = slow;
  fast.natural.value *= 2;
  CHECK_THAT(read_coupling(fast, slow, {{1e-9, 0}, {}, {}}).problem, Catch::Contains("swapped"));
}

TEST_CASE("statistical intervals of inductance, resistance and k hold the truth in 93 to 97 % of cases") {
  const double L1 = 24e-6, R1 = 0.25, C = 47e-9, k = 0.25, L2 = 20e-6, R2 = 0.5;
  const double u = 1e-6;
  const double M2 = k * k * L1 * L2;
  Eigen::VectorXd closed(4);
  closed << R2, (L2 + R1 * C * R2) / u, (C * R1 * L2 + C * L1 * R2) / (u * u),
      C * (L1 * L2 - M2) / (u * u * u);
  Eigen::VectorXd alone(3);
  alone << 1, R1 * C / u, L1 * C / (u * u);
  const RingDownMode with = ring_of(closed);
  const RingDownMode without = ring_of(alone);
  Chance chance(31);
  const int cases = 600;
  int hits_L = 0, hits_R = 0, hits_k = 0;
  for (int i = 0; i < cases; ++i) {
    std::vector<RingDownMode> rings;
    for (const RingDownMode* truth : {&without, &with}) {
      test::Scene scene;
      scene.tanks = {{truth->frequency.value * 1e6, truth->damping.value * 1e6, 3, chance.uniform(0, 6)}};
      scene.points = 400;
      scene.interval = 1e-6 / 3;
      scene.noise = 0.05;
      const test::Record capture = test::record(scene, chance);
      const RingDown fit = fit_ring_down(capture.time, capture.value);
      REQUIRE(fit.reason == "");
      rings.push_back(fit.modes.front());
    }
    const KnownCapacitor given{{C, 0}, {}, {}};
    const CoilReading coil = read_coil(rings[0], given);
    const CouplingReading pair = read_coupling(rings[0], rings[1], given);
    hits_L += coil.inductance.statistical.low <= L1 && L1 <= coil.inductance.statistical.high;
    hits_R += coil.resistance.statistical.low <= R1 && R1 <= coil.resistance.statistical.high;
    hits_k += pair.coupling.statistical.low <= k && k <= pair.coupling.statistical.high;
  }
  for (const int hits : {hits_L, hits_R, hits_k}) {
    // 600 cases of a true 95 % scatter by 0.9 %.
    CHECK(hits >= 0.93 * cases);
    CHECK(hits <= 0.97 * cases);
  }
}

}  // namespace
}  // namespace couplet::capture
