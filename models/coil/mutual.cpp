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

/// The filaments whose potential is integrated, with the pieces of those that are no circles.
struct Sources {
  const Filaments& filaments;
  std::vector<std::vector<Piece>> outlines;
  bool circles;

  explicit Sources(const Filaments& list) : filaments(list), circles(all_circles(list)) {
    for (const Filament& f : list) outlines.push_back(f.circle() ? std::vector<Piece>{} : pieces(f));
  }
  Point potential(const Point& at) const {
    Point sum = Point::Zero();
    for (size_t i = 0; i < filaments.size(); ++i) {
      const Filament& f = filaments[i];
      sum += f.turns * (f.circle() ? vector_potential(f, at) : vector_potential(outlines[i], at));
    }
    return sum;
  }
};

/// True where the arrangement is its own mirror image in the plane y = 0.
bool mirrored_across(const Pose& pose) {
  return pose.shift.y() == 0 && pose.turn(0, 1) == 0 && pose.turn(1, 0) == 0 && pose.turn(1, 2) == 0 &&
         pose.turn(2, 1) == 0;
}

/// Along a circle the integrand is smooth and periodic, so the trapezium rule converges geometrically: the
/// error after doubling the points is about the square of the change. Where the placement is its own mirror
/// image in y, half of the circle is enough.
Integral along_circle(const Sources& sources, const Filament& path, const Pose& pose, double tolerance) {
  const bool mirrored = mirrored_across(pose);
  const double span = mirrored ? pi : 2 * pi;
  double size = 0, nearest = 1e300;
  // Mean of A . dl/dphi over points at (i + offset) span/count, i = 0..count-1.
  const auto average = [&](int count, double offset) {
    double sum = 0, absolute = 0;
    for (int i = 0; i < count; ++i) {
      const double angle = (i + offset) * span / count, c = std::cos(angle), s = std::sin(angle);
      const Point at = pose(Point(path.corner * c, path.corner * s, path.height));
      const Point along = pose.turn.col(0) * (-path.corner * s) + pose.turn.col(1) * (path.corner * c);
      const double value = sources.potential(at).dot(along);
      sum += value, absolute += std::abs(value);
      for (const Filament& f : sources.filaments) nearest = std::min(nearest, distance(f, at));
    }
    size = std::max(size, absolute / count);
    return sum / count;
  };
  // Refinement multiplies the points by `factor` (nested), which raises the relative change to that power.
  // One small change may be an accident, so the one before must fit the same law; then the error is far below
  // the change.
  const int factor = mirrored ? 3 : 2;
  int count = mirrored ? 2 : 6;
  double value = average(count, mirrored ? 0.5 : 0), before = size, change = size;
  while (count < 20000) {
    const double finer = mirrored ? (value + average(count, 1.0 / 6) + average(count, 5.0 / 6)) / 3
                                  : (value + average(count, 0.5)) / 2;
    before = change, change = std::abs(finer - value), value = finer, count *= factor;
    const double goal = std::pow(0.01 * tolerance, 1.0 / factor);
    const double full_circle = mirrored ? 2 * count : count;
    const bool sees_all = full_circle * std::asinh(nearest / path.corner) >= 0.75 * std::log(1 / tolerance);
    if (sees_all && change <= size * goal && before <= size * std::pow(goal, 1.0 / factor)) break;
  }
  const double law = size * std::pow(std::max(change / size, std::pow(before / size, factor)), factor);
  return {2 * pi * value, 2 * pi * (std::min(100 * law, change) + 1e-15 * size)};
}

Integral along_pieces(const Sources& sources, const Filament& path, const Pose& pose, double tolerance) {
  using Rule = boost::math::quadrature::gauss_kronrod<double, 15>;
  const bool half = mirrored_across(pose), quarter = half && pose.coaxial();
  Integral total;
  for (const Piece& piece : pieces(path, quarter ? Part::quarter : half ? Part::half : Part::whole)) {
    const auto integrand = [&](double s) {
      Point position, direction;
      piece.at(s, position, direction);
      return sources.potential(pose(position)).dot(pose.turn * direction);
    };
    double error = 0;
    total.value += Rule::integrate(integrand, 0.0, 1.0, 12, tolerance, &error);
    total.error += error;
  }
  const double copies = quarter ? 4 : half ? 2 : 1;
  return {copies * total.value, copies * total.error};
}

Integral along(const Sources& sources, const Filament& path, const Pose& pose, double tolerance) {
  if (path.circle()) {
    if (pose.coaxial() && sources.circles) {
      const double height = pose.shift.z() + pose.turn(2, 2) * path.height;
      // Seen from the first coil the second runs the other way round where its axis is turned over.
      const double sense = pose.turn(0, 0) * pose.turn(1, 1) - pose.turn(0, 1) * pose.turn(1, 0);
      Integral total;
      for (const Filament& f : sources.filaments)
        total.value += f.turns * coaxial_circles(f.corner, path.corner, height - f.height);
      total.error = 1e-15 * total.value;
      total.value *= sense > 0 ? 1 : -1;
      return total;
    }
    return along_circle(sources, path, pose, tolerance);
  }
  return along_pieces(sources, path, pose, tolerance);
}

Integral between(const Filaments& first, const Filaments& second, const Pose& pose, double tolerance) {
  // The potential of circles is cheap, that of rectangles is not: integrate along the rectangles where only
  // one is.
  if (!all_circles(first) && all_circles(second)) return between(second, first, pose.inverse(), tolerance);
  const Sources sources(first);
  Integral total;
  for (const Filament& path : second) {
    const Integral part = along(sources, path, pose, tolerance);
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
