// SPDX-License-Identifier: MIT
#include "models/coil/plane.h"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <stdexcept>

#include "models/coil/self.h"

namespace couplet::coil {
namespace {

constexpr int most_laps = 400;

/// Reflection in the plane through `origin` with unit normal `normal`.
Pose reflection(const Point& normal, const Point& origin) {
  return {Eigen::Matrix3d::Identity() - 2 * normal * normal.transpose(), 2 * normal.dot(origin) * normal};
}

struct Mirror {
  Pose reflect;
  Point normal, origin;  // the normal points to where the coils are
  double factor;
};

std::optional<Mirror> mirror_behind_first(const Surroundings& around, const Coil& first) {
  if (!around.behind_first) return {};
  const Point normal(0, 0, 1), origin(0, 0, -first.height / 2 - around.behind_first->distance);
  return Mirror{reflection(normal, origin), normal, origin, around.behind_first->factor()};
}

std::optional<Mirror> mirror_behind_second(const Surroundings& around, const Coil& second, const Pose& pose) {
  if (!around.behind_second) return {};
  const Point normal = -pose.turn.col(2);
  const Point origin = pose(Point(0, 0, second.height / 2 + around.behind_second->distance));
  return Mirror{reflection(normal, origin), normal, origin, around.behind_second->factor()};
}

/// Lowest height of a coil's centre lines over a plane.
double clearance(const Coil& coil, const Pose& pose, const Mirror& mirror) {
  double lowest = 1e300;
  for (const Filament& f : coil.filaments)
    for (const Piece& piece : pieces(f))
      for (int i = 0; i <= 8; ++i) {
        Point position, direction;
        piece.at(i / 8.0, position, direction);
        lowest = std::min(lowest, mirror.normal.dot(pose(position) - mirror.origin));
      }
  return lowest;
}

/// Sum over j >= 1 of q^j (lap/(lap + j))^3: what is left of a series whose terms fall as a dipole's.
double remainder(double q, int lap) {
  double sum = 0, power = 1;
  for (int j = 1; j <= 100000; ++j) {
    power *= q;
    const double term = power * std::pow(lap / double(lap + j), 3);
    sum += term;
    if (std::abs(term) < 1e-6 * std::abs(sum)) break;
  }
  return sum;
}

std::string text_of(const char* format, double a, double b = 0) {
  char text[400];
  std::snprintf(text, sizeof text, format, a, b);
  return text;
}

void judge(const Plane& plane, const Coil& coil, const char* which, std::vector<std::string>& list) {
  const std::string sheet =
      std::string(plane.conducting ? "plate" : "ferrite sheet") + " behind the " + which + " coil";
  if (plane.conducting) {
    list.push_back(
        sheet +
        ": taken as an endless perfect conductor. True for a plate of several skin depths that reaches "
        "well past the coil; the heat in the plate is not counted.");
  } else {
    list.push_back(
        sheet +
        ": taken as an endless half-space of constant permeability, without loss or saturation; a real "
        "sheet gives an inductance between that of the bare coil and the one stated.");
    if (plane.thickness > 0 && plane.permeability * plane.thickness < 10 * coil.reach)
      list.push_back(
          sheet +
          text_of(": permeability times thickness is %.3g mm, less than ten times the coil's radius of "
                  "%.3g mm; flux leaks through and the effect is overstated.",
                  plane.permeability * plane.thickness * 1e3, coil.reach * 1e3));
  }
  const double needed = coil.reach + 2 * (plane.distance + coil.height);
  if (plane.reach > 0 && plane.reach < needed)
    list.push_back(
        sheet +
        text_of(": ends %.3g mm from the axis; images want at least %.3g mm (the coil's radius and twice "
                "the distance), so the effect is overstated.",
                plane.reach * 1e3, needed * 1e3));
}

}  // namespace

double Plane::factor() const {
  if (conducting) return -1;
  return std::isinf(permeability) ? 1 : (permeability - 1) / (permeability + 1);
}

std::vector<Image> images(const Surroundings& around, const Coil& first, const Coil& second, const Pose& pose,
                          int lap) {
  const auto one = mirror_behind_first(around, first), two = mirror_behind_second(around, second, pose);
  std::vector<Image> list;
  const auto add = [&](const Pose& p, double factor) {
    if (factor != 0) list.push_back({p, factor});
  };
  if (!one || !two) {
    if (lap == 1 && one) add(one->reflect, one->factor);
    if (lap == 1 && two) add(two->reflect, two->factor);
    return list;
  }
  // Reflections in turn: odd words start and end with the same sheet, even ones come in both orders.
  const double turned = std::acos(std::clamp(std::abs(one->normal.dot(two->normal)), 0.0, 1.0));
  if (turned > 1e-7 && 2 * lap * turned > pi / 2) return list;
  const Pose round = one->reflect * two->reflect, back = two->reflect * one->reflect;
  Pose forward, backward;
  for (int i = 1; i < lap; ++i) forward = forward * round, backward = backward * back;
  const double laps_factor = std::pow(one->factor * two->factor, lap - 1);
  add(forward * one->reflect, laps_factor * one->factor);
  add(backward * two->reflect, laps_factor * two->factor);
  add(forward * round, laps_factor * one->factor * two->factor);
  add(backward * back, laps_factor * one->factor * two->factor);
  return list;
}

Inductances inductances(const Coil& first, const Coil& second, const Pose& pose, const Surroundings& around,
                        double tolerance, const std::optional<Alone>& alone) {
  Inductances sum;
  sum.first = alone ? alone->first : self_inductance(first, tolerance);
  sum.second = alone ? alone->second : self_inductance(second, tolerance);
  sum.mutual = mutual(first, second, pose, tolerance);
  if (around.empty()) return sum;
  const auto one = mirror_behind_first(around, first), two = mirror_behind_second(around, second, pose);
  if (one && clearance(second, pose, *one) < 0)
    throw std::invalid_argument(
        "the second coil cuts through the sheet behind the first; enlarge the gap or lessen the tilt");
  if (two && clearance(first, {}, *two) < 0)
    throw std::invalid_argument(
        "the first coil cuts through the sheet behind the second; enlarge the gap or lessen the tilt");

  const double scale_first = sum.first.value, scale_second = sum.second.value;
  const double scale_mutual = std::sqrt(scale_first * scale_second);
  const double lap_factor = one && two ? one->factor * two->factor : 0;
  const Pose second_to_first = pose, first_to_second = pose.inverse();
  Integral last_first, last_second, last_mutual;
  double left_over = 0;
  bool ended = false;
  for (int lap = 1; lap <= most_laps; ++lap) {
    const std::vector<Image> list = images(around, first, second, pose, lap);
    if (list.empty()) {
      ended = true;
      break;
    }
    Integral part_first, part_second, part_mutual;
    const auto add = [](Integral& to, double factor, const Integral& part) {
      to.value += factor * part.value, to.error += std::abs(factor) * part.error;
    };
    for (const Image& image : list) {
      const Pose back = image.pose.inverse();
      add(part_first, image.factor, mutual(first, first, back, tolerance));
      add(part_second, image.factor,
          mutual(second, second, first_to_second * back * second_to_first, tolerance));
      add(part_mutual, image.factor, mutual(first, second, back * pose, tolerance));
    }
    add(sum.first, 1, part_first), add(sum.second, 1, part_second), add(sum.mutual, 1, part_mutual);
    last_first = part_first, last_second = part_second, last_mutual = part_mutual;
    sum.laps = lap;
    if (lap_factor == 0) return sum;
    left_over = remainder(lap_factor, lap);
    const double largest =
        std::max({std::abs(part_first.value) / scale_first, std::abs(part_second.value) / scale_second,
                  std::abs(part_mutual.value) / scale_mutual});
    if (lap >= 3 && largest * std::abs(left_over) / lap < 10 * tolerance) break;
  }
  const double added = ended ? 0 : left_over,
               unsure = ended ? 1 : std::abs(left_over) / std::max(sum.laps, 1);
  for (auto [total, last] :
       {std::pair{&sum.first, &last_first}, {&sum.second, &last_second}, {&sum.mutual, &last_mutual}}) {
    total->value += added * last->value;
    total->error += unsure * std::abs(last->value);
  }
  return sum;
}

Integral self_inductance(const Coil& coil, const std::optional<Plane>& behind, double tolerance) {
  Integral sum = self_inductance(coil, tolerance);
  if (!behind) return sum;
  Surroundings around;
  around.behind_first = behind;
  for (const Image& image : images(around, coil, coil, {}, 1)) {
    const Integral part = mutual(coil, coil, image.pose.inverse(), tolerance);
    sum.value += image.factor * part.value, sum.error += std::abs(image.factor) * part.error;
  }
  return sum;
}

std::vector<std::string> validity(const Surroundings& around, const Coil& first, const Coil& second,
                                  double tilt) {
  std::vector<std::string> list;
  if (around.behind_first) judge(*around.behind_first, first, "first", list);
  if (around.behind_second) judge(*around.behind_second, second, "second", list);
  if (around.behind_first && around.behind_second) {
    list.push_back(
        "two sheets: the series of images is cut off where the rest falls as that of dipoles; the rest is "
        "added.");
    if (tilt != 0)
      list.push_back(text_of(
          "two sheets %.3g degrees out of parallel: images are an approximation here, the coarser the more "
          "they are tilted; measure before relying on it.",
          std::abs(tilt) * 180 / pi));
  }
  return list;
}

}  // namespace couplet::coil
