// SPDX-License-Identifier: MIT
// The coupling factor of two coils from bench readings, by four methods, each with its uncertainty from the
// stated errors of the readings (first order, errors independent; about one standard deviation if the errors
// are given so).
//   open / short:        k = sqrt(1 - Lshort/Lopen)
//   aiding / opposing:   k = (Laid - Lopp) / (4 sqrt(L1 L2))
//   voltage ratio:       k = (V2/V1) sqrt(L1/L2), second coil open
//   split resonances:    two tuned coils ring at two frequencies
// (common practice; the first three follow from the definition of M.) Their worth differs widely at small k:
// with 1 % readings of equal coils at k = 0.1 they are good to 70, 7 and 1.6 %.
#pragma once

#include <string>
#include <vector>

namespace couplet::capture {

/// A reading with its relative error, 0.01 for 1 %.
struct Reading {
  double value = 0, error = 0;
};

struct CouplingFactor {
  std::string method;
  std::string problem;  // empty: good
  double k = 0;
  double error = 0;                        // of k, absolute
  std::vector<std::string> warnings = {};  // what biases this method here
};

struct OpenShort {
  Reading open, shorted;      // inductance of the first coil, second open and shorted [H]
  double second_quality = 0;  // omega L2 / R2 at the meter's frequency; 0: not known
};
CouplingFactor open_short(const OpenShort& readings);

struct AidingOpposing {
  Reading aiding, opposing;  // both coils in series [H]
  Reading first, second;     // each alone [H]
};
CouplingFactor aiding_opposing(const AidingOpposing& readings);

struct VoltageRatio {
  Reading first_voltage, second_voltage;  // driven coil, open coil, same kind (rms, peak) [V]
  Reading first, second;                  // inductances [H]
};
CouplingFactor voltage_ratio(const VoltageRatio& readings);

/// Tanks of resonance a and b alone ring together at low and high. With q = (high^2 - low^2)/(high^2 + low^2)
/// and r = (a/b)^2: k^2 = (q^2 (1 + r)^2 - (1 - r)^2) / (4 r), exact without losses; for a = b, k = q, and
/// low = a/sqrt(1 + k), high = a/sqrt(1 - k). Only the ratio of a and b enters.
struct SplitResonances {
  Reading low, high;                             // [Hz]
  Reading first_alone, second_alone;             // [Hz]
  double first_quality = 0, second_quality = 0;  // 0: not known
};
CouplingFactor split_resonances(const SplitResonances& readings);

/// Laid + Lopp = 2 (L1 + L2) whatever k is: how far the readings miss it.
struct Consistency {
  double miss = 0;         // (Laid + Lopp) / (2 (L1 + L2)) - 1
  double error = 0;        // of it, from the errors of the readings
  bool consistent = true;  // |miss| within twice its error
  std::string sentence;
};
Consistency check_inductances(const AidingOpposing& readings);

/// Several answers for one pair: the best one, and whether the others agree with it.
struct Choice {
  std::size_t best = 0;  // index of the smallest error among the good ones
  bool agree = true;     // every other good one within twice the combined error
  std::string sentence;  // names both, and what disagrees
};
/// Throws nothing; with no good answer `sentence` says so and `agree` is false.
Choice choose(const std::vector<CouplingFactor>& answers);

/// Before measuring: the error of k that each method would have, for coils `first`, `second` [H], a coupling
/// near k, and relative errors of inductance, voltage and frequency readings; best first.
struct Plan {
  std::string method;
  double relative_error = 0;  // of k
};
std::vector<Plan> plan_methods(double k, double first, double second, double inductance_error,
                               double voltage_error, double frequency_error);

}  // namespace couplet::capture
