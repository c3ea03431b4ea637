// SPDX-License-Identifier: MIT
// The ring-down of a tank in a capture -> frequency, damping and quality of each mode with 95 % intervals.
// The start of the free decay is searched, outliers and clipped samples are left out, offset and drift are
// fitted along. Where the capture holds no ring-down, or not the one that was asked for, the result says why
// instead of giving numbers.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

namespace couplet::capture {

/// A value with the interval that holds the truth in 95 of 100 cases.
struct Estimate {
  double value = 0, low = 0, high = 0;
};

struct RingDownMode {
  Estimate frequency;    // of the damped oscillation [Hz]
  Estimate damping;      // alpha of the envelope exp(-alpha t) [1/s]
  Estimate natural;      // sqrt(omega^2 + alpha^2) / (2 pi) [Hz]
  Estimate quality;      // sqrt(omega^2 + alpha^2) / (2 alpha) [1]
  double amplitude = 0;  // at `start` [unit of the values]
  double phase = 0;      // of amplitude * cos(omega (t - start) + phase) [rad]
  // Standard deviations and covariance of omega [rad/s] and alpha [1/s].
  double var_omega = 0, var_alpha = 0, cov_omega_alpha = 0;
};

struct RingDownOptions {
  std::size_t modes = 1;
  std::optional<double> start, end;           // window [s]; without: searched
  std::optional<double> clip_low, clip_high;  // samples at or beyond these are left out; without: found out
  std::optional<double> step;  // distance of quantised levels [unit of the values]; without: found out
};

struct RingDown {
  bool usable = false;
  std::string reason = "not run";   // why not usable; "" where it is
  std::vector<RingDownMode> modes;  // by frequency
  double offset = 0;                // [unit of the values], at `start`
  double start = 0, end = 0;        // window that was fitted [s]
  double noise = 0;                 // rms of what the fit leaves [unit of the values]
  double quantile = 0;              // of Student's t: half width of an interval over its standard deviation
  std::size_t used = 0, outliers = 0, clipped = 0;
  std::vector<std::string> notes;
};

/// `time` [s] strictly increasing, `value` in any unit, NaN where there is none.
RingDown fit_ring_down(const std::vector<double>& time, const std::vector<double>& value,
                       const RingDownOptions& options = {});

}  // namespace couplet::capture
