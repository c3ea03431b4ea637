// SPDX-License-Identifier: MIT
// Where in a capture the free decay lies, and a robust fit of it; only ringdown.cpp and its helper see this.
#pragma once

#include <string>
#include <vector>

#include "engine/capture/damped_fit.h"
#include "engine/capture/ringdown.h"

namespace couplet::capture {

/// The capture holds no ring-down, or not the one asked for.
struct NoRingDown {
  std::string reason;
};

struct Fitter {
  const RingDownOptions& options;
  RingDown& result;
  Samples all;          // the whole capture; weight 0: clipped or missing
  double step;          // distance of quantised levels; 0: none
  double sampling = 0;  // mean rate [Hz]
};

struct Decay {
  Samples samples;  // weight 0: clipped, missing, or outlier
  DampedFit fit;
};

/// Samples from `begin` to `end`, without those at the ends that do not count.
Samples part(const Samples& all, double begin, double end);

/// Fit, leave out what lies impossibly far off, fit again. Throws NoRingDown.
DampedFit robust_fit(Samples& samples, const std::vector<DampedMode>& start, std::size_t degree, double step);

/// The longest stretch that one fit describes: found in a part that is sure to decay, then widened on both
/// sides as far as the fit holds. Throws NoRingDown.
Decay find_decay(const Fitter& fitter);

}  // namespace couplet::capture
