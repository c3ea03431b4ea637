// SPDX-License-Identifier: MIT
#include "engine/capture/inductance.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <vector>

namespace couplet::capture {
namespace {

struct Circuit {
  double capacitance, series, conductance;
};

struct Loop {
  double inductance, resistance;  // of the whole loop
};

/// omega and alpha of a ring as plain numbers.
struct Root {
  double omega, alpha;
};

/// From s^2 + s (R/L + G/C) + (1 + R G)/(L C): sum and product of the roots.
Loop solve_loop(const Root& root, const Circuit& circuit) {
  const double leak = circuit.conductance / circuit.capacitance;
  const double product = root.omega * root.omega + root.alpha * root.alpha;
  const double ratio = 2 * root.alpha - leak;     // R/L
  const double inverse = product - ratio * leak;  // 1/(L C)
  const double inductance = 1 / (inverse * circuit.capacitance);
  return {inductance, ratio * inductance};
}

Root root_of(const RingDownMode& ring) {
  return {2 * std::numbers::pi * ring.frequency.value, ring.damping.value};
}

/// Half width of the 95 % interval over the standard deviation: Student's t of the fit.
double quantile_of(const RingDownMode& ring) {
  const double half = (ring.damping.high - ring.damping.low) / 2;
  return ring.var_alpha > 0 ? half / std::sqrt(ring.var_alpha) : 0;
}

using Law = std::function<double(const std::vector<Root>&, const Circuit&)>;

/// Value, statistical interval by first-order propagation of each ring's covariance, systematic range over
/// the corners of the given values.
PartValue propagate(const Law& law, const std::vector<RingDownMode>& rings, const KnownCapacitor& given) {
  std::vector<Root> roots;
  for (const RingDownMode& ring : rings) roots.push_back(root_of(ring));
  const double conductance = given.probe_resistance > 0 ? 1 / given.probe_resistance : 0;
  const Circuit nominal{given.capacitance.value + given.probe_capacitance.value,
                        given.series_resistance.value, conductance};
  PartValue part;
  part.value = law(roots, nominal);
  double half_squared = 0;
  for (std::size_t i = 0; i < rings.size(); ++i) {
    const auto slope = [&](double Root::*member, double deviation) {
      if (deviation == 0) return 0.0;
      std::vector<Root> up = roots;
      std::vector<Root> down = roots;
      up[i].*member += 0.1 * deviation;
      down[i].*member -= 0.1 * deviation;
      return (law(up, nominal) - law(down, nominal)) / (0.2 * deviation);
    };
    const double by_omega = slope(&Root::omega, std::sqrt(rings[i].var_omega));
    const double by_alpha = slope(&Root::alpha, std::sqrt(rings[i].var_alpha));
    const double variance = by_omega * by_omega * rings[i].var_omega +
                            by_alpha * by_alpha * rings[i].var_alpha +
                            2 * by_omega * by_alpha * rings[i].cov_omega_alpha;
    half_squared += std::max(variance, 0.0) * std::pow(quantile_of(rings[i]), 2);
  }
  const double half = std::sqrt(half_squared);
  part.statistical = {part.value, part.value - half, part.value + half};
  part.systematic = {part.value, part.value, part.value};
  for (const double c : {-1.0, 1.0}) {
    for (const double p : {-1.0, 1.0}) {
      for (const double r : {-1.0, 1.0}) {
        const Circuit corner{
            nominal.capacitance + c * given.capacitance.tolerance + p * given.probe_capacitance.tolerance,
            nominal.series + r * given.series_resistance.tolerance, conductance};
        const double value = law(roots, corner);
        part.systematic.low = std::min(part.systematic.low, value);
        part.systematic.high = std::max(part.systematic.high, value);
      }
    }
  }
  return part;
}

std::string problem_of(const KnownCapacitor& given) {
  const auto bad = [](const Stated& value) { return value.value < 0 || value.tolerance < 0; };
  if (bad(given.capacitance) || bad(given.probe_capacitance) || bad(given.series_resistance) ||
      given.probe_resistance < 0) {
    return "capacitances, resistances and tolerances must not be negative";
  }
  const double least = given.capacitance.value + given.probe_capacitance.value - given.capacitance.tolerance -
                       given.probe_capacitance.tolerance;
  return least > 0 ? "" : "the capacitance may be zero within its tolerance";
}

/// -omega / Im(s^2 / X) / L1 with X from the loop equation of the closed ring: k^2, which may come out
/// negative.
double coupling_squared(const Root& alone, const Root& closed, const Circuit& circuit) {
  const Loop first = solve_loop(alone, circuit);
  const std::complex<double> s(-closed.alpha, closed.omega);
  const std::complex<double> impedance =
      first.resistance + s * first.inductance + 1.0 / (s * circuit.capacitance + circuit.conductance);
  const std::complex<double> reflected = -impedance;
  return closed.omega / (first.inductance * std::imag(-s * s / reflected));
}

}  // namespace

CoilReading read_coil(const RingDownMode& ring, const KnownCapacitor& capacitor) {
  CoilReading reading;
  reading.problem = problem_of(capacitor);
  if (!reading.problem.empty()) return reading;
  const auto inductance = [](const std::vector<Root>& root, const Circuit& circuit) {
    return solve_loop(root.front(), circuit).inductance;
  };
  const auto resistance = [](const std::vector<Root>& root, const Circuit& circuit) {
    return solve_loop(root.front(), circuit).resistance - circuit.series;
  };
  const auto quality = [&](const std::vector<Root>& root, const Circuit& circuit) {
    return root.front().omega * inductance(root, circuit) / resistance(root, circuit);
  };
  reading.inductance = propagate(inductance, {ring}, capacitor);
  reading.resistance = propagate(resistance, {ring}, capacitor);
  if (!(reading.inductance.value > 0)) {
    reading.problem = "the probe's resistance alone would damp more than was seen; is it right?";
  } else if (!(reading.resistance.value > 0)) {
    reading.problem = fmt::format(
        "the loop has {:.4g} ohm, less than the series resistance given ({:.4g} ohm)",
        reading.resistance.value + capacitor.series_resistance.value, capacitor.series_resistance.value);
  } else {
    reading.quality = propagate(quality, {ring}, capacitor);
  }
  return reading;
}

CouplingReading read_coupling(const RingDownMode& alone, const RingDownMode& closed,
                              const KnownCapacitor& capacitor) {
  CouplingReading reading;
  reading.problem = problem_of(capacitor);
  if (!reading.problem.empty()) return reading;
  const auto squared = [](const std::vector<Root>& root, const Circuit& circuit) {
    return coupling_squared(root[0], root[1], circuit);
  };
  const auto reflected = [](const std::vector<Root>& root, const Circuit& circuit) {
    return solve_loop(root[1], circuit).resistance - solve_loop(root[0], circuit).resistance;
  };
  const PartValue square = propagate(squared, {alone, closed}, capacitor);
  if (!(closed.natural.value > alone.natural.value)) {
    reading.problem =
        "the second ring is not faster than the first: a closed coil takes inductance away; are the "
        "captures swapped, or is a capacitor in the second loop?";
    return reading;
  }
  if (!(square.value > 0) || square.value >= 1) {
    reading.problem = fmt::format(
        "k squared comes out as {:.4g}; the captures do not belong to one pair of coils", square.value);
    return reading;
  }
  const auto root = [](double value) { return std::sqrt(std::clamp(value, 0.0, 1.0)); };
  const auto rooted = [&](const Estimate& e) { return Estimate{root(e.value), root(e.low), root(e.high)}; };
  reading.coupling = {root(square.value), rooted(square.statistical), rooted(square.systematic)};
  reading.reflected_resistance = propagate(reflected, {alone, closed}, capacitor);
  const double conductance = capacitor.probe_resistance > 0 ? 1 / capacitor.probe_resistance : 0;
  const Circuit circuit{capacitor.capacitance.value + capacitor.probe_capacitance.value, 0, conductance};
  reading.reflected_inductance =
      solve_loop(root_of(closed), circuit).inductance - solve_loop(root_of(alone), circuit).inductance;
  return reading;
}

}  // namespace couplet::capture
