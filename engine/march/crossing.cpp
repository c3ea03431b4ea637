// SPDX-License-Identifier: MIT
#include "engine/march/crossing.h"

#include <initializer_list>

namespace couplet {

double GuardStep::lowest(double& where) const {
  where = v0 <= v1 ? 0 : 1;
  double best = std::min(v0, v1);
  // p' = d0 + 2 c2 t + 3 c3 t^2
  const double a = 3 * cubic3(), b = 2 * cubic2(), c = d0;
  const double inside = b * b - 4 * a * c;
  if (inside < 0) return best;
  const double q = -0.5 * (b + std::copysign(std::sqrt(inside), b));
  for (double t : {a != 0 ? q / a : -1.0, q != 0 ? c / q : -1.0}) {
    if (t > 0 && t < 1 && cubic(t) < best) best = cubic(t), where = t;
  }
  return best;
}

double GuardStep::quintic(double t, double& slope) const {
  // v0 + d0 t + c0/2 t^2 + t^3 (e + f t + g t^2), the last three from the far end.
  const double r = v1 - v0 - d0 - c0 / 2, s = d1 - d0 - c0, q = c1 - c0;
  const double e = 10 * r - 4 * s + q / 2, f = -15 * r + 7 * s - q, g = 6 * r - 3 * s + q / 2;
  slope = d0 + t * (c0 + t * (3 * e + t * (4 * f + t * 5 * g)));
  return v0 + t * (d0 + t * (c0 / 2 + t * (e + t * (f + t * g))));
}

double GuardStep::root(double low, double high) const {
  // Good to a millionth of the step: a first guess, which the march's own series then narrows.
  double slope = 0, value_low = quintic(low, slope), value_high = quintic(high, slope);
  double t = low + (high - low) * value_low / (value_low - value_high);
  for (int i = 0; i < 40; ++i) {
    const double value = quintic(t, slope);
    (value > 0 ? low : high) = t;
    double next = slope < 0 ? t - value / slope : low;
    if (!(next > low && next < high)) next = 0.5 * (low + high);
    if (std::abs(next - t) < 1e-6) return next;
    t = next;
  }
  return t;
}

}  // namespace couplet
