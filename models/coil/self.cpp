// SPDX-License-Identifier: MIT
#include "models/coil/self.h"

#include <cmath>
#include <complex>

namespace couplet::coil {
namespace {

/// ln of the geometric mean distance of two parallel strips of one width, `beside` along the width and
/// `above` across it: the second difference of z^2 ln z/2 - 3 z^2/4 over the complex plane, whose second
/// derivative is ln z.
double log_mean_distance(double width, double beside, double above) {
  const auto twice_integrated = [](std::complex<double> z) {
    return std::abs(z) == 0 ? std::complex<double>(0) : z * z * (0.5 * std::log(z) - 0.75);
  };
  const std::complex<double> z(std::abs(beside), std::abs(above));
  const std::complex<double> sum =
      twice_integrated(z + width) + twice_integrated(z - width) - 2.0 * twice_integrated(z);
  return sum.real() / (width * width);
}

/// What the width of two traces adds to the mutual inductance of their centre lines, H.
double width_correction(const Coil& coil, const Filament& a, const Filament& b) {
  if (coil.conductor.kind != Conductor::Kind::trace) return 0;
  const double in_plane = a.half_length - b.half_length, along_axis = a.height - b.height;
  const bool flat = coil.across == coil.conductor.width;
  const double beside = flat ? in_plane : along_axis, above = flat ? along_axis : in_plane;
  const double centres = std::hypot(beside, above);
  if (centres > 20 * coil.conductor.width)
    return 0;  // below 2e-4 of ln, and the differences lose their digits
  const double share = std::log(centres) - log_mean_distance(coil.conductor.width, beside, above);
  return mu0 / (2 * pi) * 0.5 * (a.length() + b.length()) * share;
}

}  // namespace

double mean_radius(const Conductor& conductor) {
  if (conductor.kind == Conductor::Kind::trace) return 0.2235 * (conductor.width + conductor.thickness);
  return conductor.bundle() / 2 * std::exp(-0.25);
}

double turn_inductance(const Filament& turn, const Conductor& conductor) {
  const double g = mean_radius(conductor);
  if (turn.circle()) return mu0 * turn.corner * (std::log(8 * turn.corner / g) - 2);
  Pose above;
  above.shift.z() = g;
  return mutual(turn, turn, above, 1e-9).value;
}

Integral self_inductance(const Coil& coil, double tolerance) {
  Integral total;
  const auto& list = coil.filaments;
  for (size_t i = 0; i < list.size(); ++i) {
    total.value += list[i].turns * list[i].turns * turn_inductance(list[i], coil.conductor);
    for (size_t j = 0; j < i; ++j) {
      const Integral part = mutual(list[i], list[j], {}, tolerance);
      const double both = 2 * list[i].turns * list[j].turns;
      total.value += both * (part.value + width_correction(coil, list[i], list[j]));
      total.error += both * part.error;
    }
  }
  return total;
}

}  // namespace couplet::coil
