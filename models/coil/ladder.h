// SPDX-License-Identifier: MIT
// A resistance that grows with frequency, and the inductance that falls with it, as a network for the time
// domain: one resistance and one inductance in series with a chain of branches, each a resistance in parallel
// with an inductance. Every element is positive, so the network is passive whatever the data were.
#pragma once

#include <vector>

namespace couplet::coil {

struct Sample {
  double frequency = 0;   // Hz; 0 for a dc resistance (its inductance is not used)
  double resistance = 0;  // ohm
  double inductance = 0;  // H
};

/// A resistance in parallel with an inductance, in series with the rest.
struct Branch {
  double resistance = 0, inductance = 0;
};

struct Ladder {
  double resistance = 0, inductance = 0;  // the plain series part; its resistance is that at dc
  std::vector<Branch> branches;
  double low = 0, high = 0;  // Hz, the band it was fitted over
  // The largest relative deviations over the samples, and where they are.
  double resistance_deviation = 0, resistance_deviation_at = 0;
  double inductance_deviation = 0, inductance_deviation_at = 0;

  Sample at(double frequency) const;
};

/// Fits with as few branches as bring both deviations below `goal`, at most `most_branches`; the deviations
/// reached are stated in the result, also where they miss the goal. Levenberg-Marquardt on the logarithms of
/// the elements, relative deviations squared (D. W. Marquardt 1963). Throws std::invalid_argument where
/// samples are not positive or there are fewer than two frequencies.
Ladder fit_ladder(const std::vector<Sample>& samples, double goal = 0.01, int most_branches = 6);

/// `count` frequencies from low to high in equal ratios.
std::vector<double> band(double low, double high, int count = 40);

}  // namespace couplet::coil
