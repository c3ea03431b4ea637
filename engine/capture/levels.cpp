// SPDX-License-Identifier: MIT
#include "engine/capture/levels.h"

#include <algorithm>
#include <cmath>

namespace couplet::capture {
namespace {

/// Distance of the levels where the values lie on few of them; 0 where they do not repeat.
double level_step(std::vector<double> values) {
  const std::size_t n = values.size();
  std::sort(values.begin(), values.end());
  const double range = values.back() - values.front();
  if (!(range > 0)) return 0;
  double step = range;
  std::size_t levels = 1;
  for (std::size_t i = 1; i < n; ++i) {
    const double gap = values[i] - values[i - 1];
    if (gap <= 1e-6 * range) continue;
    ++levels;
    step = std::min(step, gap);
  }
  // Twelve bits at most, and on average two values a level.
  return levels <= 4096 && 2 * levels <= n ? step : 0;
}

/// A flat end: runs of the extreme value too long for the neighbourhood. Near its top a sine spends at
/// most 2.4 times as long in the last level as in the one below it (square roots of the distance to the top);
/// clipping has no bound.
bool flat_end(const std::vector<double>& values, double extreme, double step, double range) {
  const double same = std::max(step / 2, 1e-6 * range);
  const double band = std::max(step, 0.01 * range);
  std::size_t at_end = 0;
  std::size_t near = 0;
  std::size_t run = 0;
  std::size_t longest = 0;
  for (const double value : values) {
    const double distance = std::abs(value - extreme);
    run = distance < same ? run + 1 : 0;
    longest = std::max(longest, run);
    if (distance < same) {
      ++at_end;
    } else if (distance < same + band) {
      ++near;
    }
  }
  return longest >= 3 && at_end >= 3 * near + 3;
}

}  // namespace

Levels find_levels(const std::vector<double>& values) {
  const auto [low, high] = std::minmax_element(values.begin(), values.end());
  Levels levels{*low, *high, level_step(values)};
  const double range = levels.high - levels.low;
  levels.flat_low = range > 0 && flat_end(values, levels.low, levels.step, range);
  levels.flat_high = range > 0 && flat_end(values, levels.high, levels.step, range);
  return levels;
}

}  // namespace couplet::capture
