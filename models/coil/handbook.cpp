// SPDX-License-Identifier: MIT
#include "models/coil/handbook.h"

#include <boost/math/special_functions/ellint_1.hpp>
#include <boost/math/special_functions/ellint_2.hpp>
#include <cmath>

#include "models/coil/filament.h"

namespace couplet::coil::handbook {
namespace {

constexpr double inch = 0.0254;

double sheet(double turns, double outer, double inner, double c1, double c2, double c3, double c4) {
  const double average = (outer + inner) / 2, rho = (outer - inner) / (outer + inner);
  return mu0 * turns * turns * average * c1 / 2 * (std::log(c2 / rho) + c3 * rho + c4 * rho * rho);
}

}  // namespace

double spiral_circle(double turns, double outer, double inner) {
  return sheet(turns, outer, inner, 1.00, 2.46, 0.00, 0.20);
}

double spiral_square(double turns, double outer, double inner) {
  return sheet(turns, outer, inner, 1.27, 2.07, 0.18, 0.13);
}

double spiral_square_wheeler(double turns, double outer, double inner) {
  const double average = (outer + inner) / 2, rho = (outer - inner) / (outer + inner);
  return 2.34 * mu0 * turns * turns * average / (1 + 2.75 * rho);
}

double spiral_wheeler(double turns, double mean_radius, double depth) {
  const double r = mean_radius / inch, c = depth / inch;
  return 1e-6 * r * r * turns * turns / (8 * r + 11 * c);
}

double solenoid_wheeler(double turns, double radius, double length) {
  const double r = radius / inch, l = length / inch;
  return 1e-6 * r * r * turns * turns / (9 * r + 10 * l);
}

double multilayer_wheeler(double turns, double mean_radius, double length, double depth) {
  const double r = mean_radius / inch, l = length / inch, c = depth / inch;
  return 0.8e-6 * r * r * turns * turns / (6 * r + 9 * l + 10 * c);
}

double nagaoka(double ratio) {
  // K_N = (4/(3 pi k')) ((k'^2/k^2)(K - E) + E - k), k = diameter / sqrt(diameter^2 + length^2)
  const double k = ratio / std::sqrt(1 + ratio * ratio), other = 1 / std::sqrt(1 + ratio * ratio);
  const double first = boost::math::ellint_1(k), second = boost::math::ellint_2(k);
  return 4 / (3 * pi * other) * (other * other / (k * k) * (first - second) + second - k);
}

double solenoid_sheet(double turns, double diameter, double length) {
  return mu0 * turns * turns * pi * diameter * diameter / (4 * length) * nagaoka(diameter / length);
}

double loop(double radius, double wire_radius) {
  return mu0 * radius * (std::log(8 * radius / wire_radius) - 1.75);
}

double square(double side, double wire_radius) {
  static const double constant =
      std::asinh(1.0) + 1.75 - std::sqrt(2.0) - std::log(2.0);  // printed as 0.52401
  return 2 * mu0 * side / pi * (std::log(side / wire_radius) - constant);
}

double coaxial_squares(double s, double d) {
  const double one = std::sqrt(s * s + d * d), two = std::sqrt(2 * s * s + d * d);
  // Each side meets the one above it and the opposite one of the other square.
  const auto parallel = [&](double distance, double diagonal) {
    return s * std::asinh(s / distance) - diagonal + distance;
  };
  return 2 * mu0 / pi * (parallel(d, one) - parallel(one, two));
}

double dipoles(double first_radius, double second_radius, double distance) {
  return mu0 * pi * std::pow(first_radius * second_radius, 2) / (2 * std::pow(distance, 3));
}

double near_loops(double radius, double distance) {
  return mu0 * radius * (std::log(8 * radius / distance) - 2);
}

}  // namespace couplet::coil::handbook
