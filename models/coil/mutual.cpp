// SPDX-License-Identifier: MIT
#include "models/coil/mutual.h"

#include <algorithm>
#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <cmath>

namespace couplet::coil {
namespace {

using Filaments = std::vector<Filament>;

bool all_circles(const Filaments& list) {
  return std::all_of(list.begin(), list.end(), [](const Filament& f) { return f.circle(); });
}

Point potential(const Filaments& sources, const Point& at) {
  Point sum = Point::Zero();
  for (const Filament& f : sources) sum += f.turns * vector_potential(f, at);
  return sum;
}

/// Along a circle the integrand is smooth and periodic, so the trapezium rule converges geometrically: the
/// error after doubling the points is about the square of the change. Where the placement is its own mirror
/// image in y, half of the circle is enough.
Integral along_circle(const Filaments& sources, const Filament& path, const Pose& pose, double tolerance) {
  const bool mirrored = pose.shift.y() == 0 && pose.turn(0, 1) == 0 && pose.turn(1, 0) == 0 &&
                        pose.turn(1, 2) == 0 && pose.turn(2, 1) == 0;
  const double span = mirrored ? pi : 2 * pi;
  double size = 0;
  // Mean of A . dl/dphi over points at (i + offset) span/count, i = 0..count-1.
  const auto average = [&](int count, double offset) {
    double sum = 0, absolute = 0;
    for (int i = 0; i < count; ++i) {
      const double angle = (i + offset) * span / count, c = std::cos(angle), s = std::sin(angle);
      const Point at = pose(Point(path.corner * c, path.corner * s, path.height));
      const Point along = pose.turn.col(0) * (-path.corner * s) + pose.turn.col(1) * (path.corner * c);
      const double value = potential(sources, at).dot(along);
      sum += value, absolute += std::abs(value);
    }
    size = std::max(size, absolute / count);
    return sum / count;
  };
  if (mirrored) {
    // Points at half steps of 0..pi stand for the whole circle; tripling nests them (1/6, 3/6, 5/6 of a
    // step).
    int count = 6;
    double value = average(count, 0.5), change = 0;
    while (count < 5000) {
      const double finer = (value + average(count, 1.0 / 6) + average(count, 5.0 / 6)) / 3;
      change = std::abs(finer - value), value = finer, count *= 3;
      // The error is about change^3/size^2 by now; the cube root is taken with a thousandfold reserve.
      if (change <= size * std::cbrt(tolerance) * 0.1) break;
    }
    const double error = change * std::pow(change / size, 2) * 1e3 + 1e-15 * size;
    return {2 * pi * value, 2 * pi * std::min(error, change)};
  }
  int count = 12;
  double value = average(count, 0), change = 0;
  while (count < 20000) {
    const double finer = (value + average(count, 0.5)) / 2;
    change = std::abs(finer - value), value = finer, count *= 2;
    if (change <= size * std::sqrt(tolerance) * 0.1) break;
  }
  const double error = change * (change / size) * 1e2 + 1e-15 * size;
  return {2 * pi * value, 2 * pi * std::min(error, change)};
}

Integral along_pieces(const Filaments& sources, const Filament& path, const Pose& pose, bool quarter,
                      double tolerance) {
  using Rule = boost::math::quadrature::gauss_kronrod<double, 15>;
  Integral total;
  for (const Piece& piece : pieces(path, quarter)) {
    const auto integrand = [&](double s) {
      Point position, direction;
      piece.at(s, position, direction);
      return potential(sources, pose(position)).dot(pose.turn * direction);
    };
    double error = 0;
    total.value += Rule::integrate(integrand, 0.0, 1.0, 12, tolerance, &error);
    total.error += error;
  }
  const double copies = quarter ? 4 : 1;
  return {copies * total.value, copies * total.error};
}

/// True where both coils share the planes x = 0 and y = 0 as mirrors.
bool shares_mirrors(const Pose& pose) {
  return pose.coaxial() && std::abs(pose.turn(0, 1)) < 1e-13 && std::abs(pose.turn(1, 0)) < 1e-13;
}

Integral along(const Filaments& sources, const Filament& path, const Pose& pose, double tolerance) {
  if (path.circle()) {
    if (pose.coaxial() && all_circles(sources)) {
      const double height = pose.shift.z() + pose.turn(2, 2) * path.height;
      // Seen from the first coil the second runs the other way round where its axis is turned over.
      const double sense = pose.turn(0, 0) * pose.turn(1, 1) - pose.turn(0, 1) * pose.turn(1, 0);
      Integral total;
      for (const Filament& f : sources)
        total.value += f.turns * coaxial_circles(f.corner, path.corner, height - f.height);
      total.error = 1e-15 * total.value;
      total.value *= sense > 0 ? 1 : -1;
      return total;
    }
    return along_circle(sources, path, pose, tolerance);
  }
  return along_pieces(sources, path, pose, shares_mirrors(pose), tolerance);
}

Integral between(const Filaments& first, const Filaments& second, const Pose& pose, double tolerance) {
  // The potential of circles is cheap, that of rectangles is not: integrate along the rectangles where only
  // one is.
  if (!all_circles(first) && all_circles(second)) return between(second, first, pose.inverse(), tolerance);
  Integral total;
  for (const Filament& path : second) {
    const Integral part = along(first, path, pose, tolerance);
    total.value += path.turns * part.value;
    total.error += path.turns * part.error;
  }
  return total;
}

}  // namespace

Integral mutual(const Filament& first, const Filament& second, const Pose& second_in_first,
                double tolerance) {
  Filament one = first, other = second;
  one.turns = other.turns = 1;
  return between({one}, {other}, second_in_first, tolerance);
}

Integral mutual(const Coil& first, const Coil& second, const Pose& second_in_first, double tolerance) {
  return between(first.filaments, second.filaments, second_in_first, tolerance);
}

}  // namespace couplet::coil
