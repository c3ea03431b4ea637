// SPDX-License-Identifier: MIT
// Does a guard cross zero inside a step? Answered from its value, slope and second derivative at both ends.
//
// Let p be the cubic through values and slopes (Hermite), on [0, 1] after scaling time by the step h. Where the guard
// is smooth over the step, guard - p is about K t^2 (1-t)^2 with K = h^4 g''''/24, and the second derivatives at the
// ends differ from p's by 2 K each. Taking K = half the sum of both differences is twice that, and an unresolved fast
// mode or ring inflates it by (rate x step)^2, so that a step which hides one is refused, not accepted.
// p - K t^2 (1-t)^2 is a quartic; positive Bernstein coefficients prove that it has no zero.
#pragma once

#include <algorithm>
#include <cmath>

namespace couplet {

/// A guard over one step, already multiplied by its bit's sign (positive: the bit stands) and slopes by h, h^2.
struct GuardStep {
  double v0, d0, c0, v1, d1, c1;

  double cubic2() const { return 3 * (v1 - v0) - 2 * d0 - d1; }
  double cubic3() const { return d0 + d1 - 2 * (v1 - v0); }
  double cubic(double t) const { return v0 + t * (d0 + t * (cubic2() + t * cubic3())); }
  /// K of the comment above.
  double doubt() const {
    return 0.5 * (std::abs(c0 - 2 * cubic2()) + std::abs(c1 - 2 * cubic2() - 6 * cubic3()));
  }
  /// Smallest of the quartic's Bernstein coefficients behind the first: > 0 (with v0 >= 0) means no crossing.
  double margin() const {
    const double b1 = v0 + d0 / 3, b2 = v1 - d1 / 3;
    const double q1 = (v0 + 3 * b1) / 4, q2 = (b1 + b2) / 2 - doubt() / 6, q3 = (3 * b2 + v1) / 4;
    return std::min(std::min(q1, q2), std::min(q3, v1));
  }
  /// Smallest value of the cubic on [0, 1] and where.
  double lowest(double& where) const;
  /// The quintic through values, slopes and second derivatives of both ends, and its slope.
  double quintic(double t, double& slope) const;
  /// First zero of the quintic between a point where it is positive and one where it is negative.
  double root(double low, double high) const;
};

}  // namespace couplet
