// SPDX-License-Identifier: MIT
// What the converter did to a signal: the distance of its levels, and ends that are flat because it had no
// more.
#pragma once

#include <vector>

namespace couplet::capture {

struct Levels {
  double low = 0, high = 0;  // smallest and largest value [unit of the values]
  double step = 0;           // distance of the levels [unit of the values]; 0: the values lie on no levels
  bool flat_low = false, flat_high = false;  // clipped at `low`, `high` (or truly flat there)
};

/// `values` must be finite, in the order of time, and at least two.
Levels find_levels(const std::vector<double>& values);

}  // namespace couplet::capture
