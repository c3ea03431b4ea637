// SPDX-License-Identifier: MIT
// The periodic steady state, found directly.
//
//   march from rest until two returns in a row agree roughly
//   repeat: one lap with its monodromy matrix M; solve
//       [ (1 + 1/N) I - M   -f ] [dx]   [ P(x) - x ]
//       [        c           0 ] [dT] = [  - c x   ]      (driven: without the border)
//     N large is Newton's step; a finite N is a leap over about N periods that damps what Newton would overshoot
//   until the Newton step is small, then take it; stop at 1e-11 of the state, or at the floor of round-off
//   multipliers: eigenvalues of M; a free orbit has one at 1, left out and reported as a check
//   an orbit with a multiplier outside the unit circle is real but no bench shows it: nudge, march, try again
//   no plain orbit: look for one that repeats after n returns; none: say that it does not repeat, or rests
//
// Shooting with exact linear flows: T. J. Aprille, T. N. Trick, Proc. IEEE 60 (1972) 108, is the classical source.
#pragma once

#include <complex>

#include "engine/orbit/lap.h"

namespace couplet {

struct Orbit {
  enum class Kind { plain, several_returns, rest, not_periodic, unstable, failed };
  Kind kind = Kind::failed;
  std::string sentence = "not run";
  MarchState start;             // on the section
  double period = 0;            // s, of all returns together
  int returns = 1;
  Eigen::MatrixXd monodromy;
  std::vector<std::complex<double>> multipliers;  // largest first, the trivial one left out
  double trivial_error = std::numeric_limits<double>::quiet_NaN();    // |multiplier nearest 1 - 1|, free orbits
  double field_error = std::numeric_limits<double>::quiet_NaN();      // |M f - f| / |f|, free orbits
  double residual = std::numeric_limits<double>::quiet_NaN();         // |P(x) - x| / |x|
  std::vector<double> residuals;  // of the last iterations, relative
  long laps = 0;
  double seconds = 0;
  std::vector<std::string> notes;  // what was met on the way: unstable orbits, several returns, ...
  bool found() const { return kind == Kind::plain || kind == Kind::several_returns; }
  double largest_multiplier() const { return multipliers.empty() ? 0 : std::abs(multipliers.front()); }
};

struct SettleOptions {
  double patience = 0;       // s: longest march from rest; > 0
  bool guess_only = false;   // warm: Newton from the guess alone, no marching, no search
};

/// From rest, or from `guess` (a state near the orbit, with its period) where given.
Orbit settle(Lapper& lapper, const SettleOptions& options, const MarchState* guess = nullptr, double guess_period = 0);

}  // namespace couplet
