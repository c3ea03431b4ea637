// SPDX-License-Identifier: MIT
// `follow`: the settled state along one value, by pseudo-arclength steps, so that folds are passed and not fallen off.
//
// Unknowns y = (state / its size, log value). Predictor: the secant through the last two points. Corrector: Newton on
// "repeats after one return, on the section, and at distance ds along the secant", the derivative by the value from one more
// lap at value (1 + 1e-6). A corrected point farther than ds/2 from its prediction is refused: it belongs to another
// part of the path. (H. B. Keller 1977 introduced the arclength condition.)
#pragma once

#include <functional>

#include "engine/study/steady_state.h"

namespace couplet {

struct FollowOptions {
  std::string along;
  double from = 0, to = 0;       // SI, positive
  int most_points = 1500;
  std::function<void(double share)> progress;
};

struct PathPoint {
  double value = 0, period = 0;
  bool stable = false;
  std::complex<double> multiplier;  // the largest, trivial one left out
  Figures figures;
  int newton_steps = 0;
};

struct PathMark {
  double value = 0, frequency = 0;
  std::string words;  // "fold: the path turns back here", "period doubling", ...
};

struct Path {
  std::string along, unit;
  std::vector<PathPoint> points;
  std::vector<PathMark> marks;
  std::string sentence;           // why it ended
  bool reached = false;           // the far end
  long refused = 0;
  double seconds = 0;
};

/// Throws InputError for a value that does not exist or a range that makes no sense.
Path follow(const Design& design, const FollowOptions& options);

}  // namespace couplet
