// SPDX-License-Identifier: MIT
// Least squares for a sum of damped sinusoids on a polynomial baseline, with the covariance of its
// parameters:
//   y(t) = sum_m exp(-alpha_m (t - t0)) (a_m cos w_m (t - t0) + b_m sin w_m (t - t0)) + sum_d c_d ((t -
//   t0)/T)^d
// Levenberg-Marquardt (D. W. Marquardt, J. SIAM 11, 1963) over all parameters, analytic derivatives.
#pragma once

#include <cmath>
#include <cstddef>
#include <vector>

namespace couplet::capture {

struct DampedMode {
  double omega = 0;             // [rad/s], damped
  double alpha = 0;             // [1/s]
  double cosine = 0, sine = 0;  // a, b [unit of y], at t0
  double var_omega = 0;         // [(rad/s)^2]
  double var_alpha = 0;         // [1/s^2]
  double cov_omega_alpha = 0;   // [rad/s^2]
  double amplitude() const { return std::hypot(cosine, sine); }
};

struct DampedFit {
  std::vector<DampedMode> modes;
  std::vector<double> baseline;  // c_d [unit of y]
  double origin = 0, span = 1;   // t0, T [s]
  double noise = 0;              // rms residual over the degrees of freedom [unit of y]
  double freedom = 0;            // degrees of freedom of the quantiles that go with the variances
  double colour = 1;             // noise power at the modes' frequencies over that of white noise
  double sum_of_squares = 0;
  bool converged = false;

  double operator()(double t) const;  // model at t
};

/// Samples that take part; `weight` 0 leaves one out.
struct Samples {
  std::vector<double> time, value, weight;
  std::size_t used() const;
};

/// Start values from the spectrum: the `count` strongest lines, each with the decay that fits best. `time`
/// should be close to even; missing samples are bridged.
std::vector<DampedMode> spectral_start(const Samples& samples, std::size_t count);

/// From start values to the minimum. `degree` is that of the baseline.
DampedFit fit_damped(const Samples& samples, const std::vector<DampedMode>& start, std::size_t degree);

/// Replaces the covariance of white noise by that of the noise found around the modes' frequencies where the
/// two differ significantly: correlated residuals (few levels of quantisation, interpolated points, hum) make
/// plain least squares err by just the ratio of the two, since its derivatives are narrow-band signals.
void colour_covariance(const Samples& samples, DampedFit& fit);

/// The largest line that the residual still holds under the envelope of the first mode: its frequency [Hz],
/// its amplitude at t0 [unit of y], and whether white noise would show such a line in less than 1 of 10,000
/// records.
struct Line {
  double frequency = 0, amplitude = 0;
  bool significant = false;
};
Line residual_line(const Samples& samples, const DampedFit& fit);

}  // namespace couplet::capture
