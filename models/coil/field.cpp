// SPDX-License-Identifier: MIT
#include "models/coil/field.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace couplet::coil {
namespace {

Point of_coil(const Coil& coil, const Pose& pose, const Point& at) {
  const Point seen = pose.inverse()(at);
  Point sum = Point::Zero();
  for (const Filament& f : coil.filaments) sum += f.turns * flux_density(f, seen);
  return pose.turn.determinant() * (pose.turn * sum);
}

/// Images up to the lap at which they stop mattering to a figure of three digits.
constexpr int laps = 12;

std::vector<Image> images_seen(const Scene& scene) {
  std::vector<Image> list{{Pose{}, 1.0}};
  for (int lap = 1; lap <= laps; ++lap)
    for (const Image& image :
         images(scene.surroundings, scene.first, scene.second, scene.second_in_first, lap))
      list.push_back(image);
  return list;
}

bool before_sheets(const Scene& scene, const Point& at) {
  const Surroundings& around = scene.surroundings;
  if (around.behind_first && at.z() < -scene.first.height / 2 - around.behind_first->distance) return false;
  if (!around.behind_second) return true;
  return scene.second_in_first.inverse()(at).z() < scene.second.height / 2 + around.behind_second->distance;
}

/// Heights and radius of the cylinder, about the first coil's axis, that holds both coils.
struct Cylinder {
  double low, high, radius;
};

Cylinder around(const Scene& scene) {
  Cylinder c{-scene.first.height / 2, scene.first.height / 2, scene.first.reach};
  const Pose& p = scene.second_in_first;
  const double lean = std::hypot(p.turn(2, 0), p.turn(2, 1));
  const double half = scene.second.reach * lean + scene.second.height / 2 * std::abs(p.turn(2, 2));
  c.low = std::min(c.low, p.shift.z() - half), c.high = std::max(c.high, p.shift.z() + half);
  c.radius = std::max(c.radius, std::hypot(p.shift.x(), p.shift.y()) + scene.second.reach);
  return c;
}

}  // namespace

double reference_level(double f, Exposure exposure) {
  if (!(f >= 1) || f > 10e6)
    throw std::invalid_argument("reference levels of ICNIRP 2010 are for 1 Hz to 10 MHz, asked at " +
                                std::to_string(f) + " Hz");
  if (exposure == Exposure::general_public) {
    if (f < 8) return 4e-2 / (f * f);
    if (f < 25) return 5e-3 / f;
    if (f < 400) return 2e-4;
    return f < 3e3 ? 8e-2 / f : 2.7e-5;
  }
  if (f < 8) return 0.2 / (f * f);
  if (f < 25) return 2.5e-2 / f;
  if (f < 300) return 1e-3;
  return f < 3e3 ? 0.3 / f : 1e-4;
}

std::vector<FieldAt> field_at(const Scene& scene, const std::vector<CurrentLine>& currents,
                              const std::vector<Point>& points) {
  const std::vector<Image> seen = images_seen(scene);
  std::vector<FieldAt> list;
  for (const Point& at : points) {
    Point first = Point::Zero(), second = Point::Zero();
    const bool with_images = before_sheets(scene, at);
    for (size_t i = 0; i < (with_images ? seen.size() : 1); ++i) {
      first += seen[i].factor * of_coil(scene.first, seen[i].pose, at);
      second += seen[i].factor * of_coil(scene.second, seen[i].pose * scene.second_in_first, at);
    }
    FieldAt here;
    here.at = at;
    double squares = 0;
    for (const CurrentLine& line : currents) {
      const Eigen::Vector3cd b =
          first.cast<std::complex<double>>() * line.first + second.cast<std::complex<double>>() * line.second;
      squares += b.squaredNorm();
      here.public_share += b.norm() / reference_level(line.frequency, Exposure::general_public);
      here.occupational_share += b.norm() / reference_level(line.frequency, Exposure::occupational);
    }
    here.flux_density = std::sqrt(squares);
    list.push_back(here);
  }
  return list;
}

FieldAt largest_field(const Scene& scene, const std::vector<CurrentLine>& currents, double distance) {
  const Cylinder c = around(scene);
  const double radius = c.radius + distance;
  std::vector<Point> points;
  const int angles = 24, steps = 8;
  for (int a = 0; a < angles; ++a) {
    const double x = std::cos(2 * pi * a / angles), y = std::sin(2 * pi * a / angles);
    for (int i = 0; i <= steps; ++i) {
      const double share = i / double(steps), z = c.low + share * (c.high - c.low);
      points.emplace_back(radius * x, radius * y, z);
      points.emplace_back(share * c.radius * x, share * c.radius * y, c.high + distance);
      points.emplace_back(share * c.radius * x, share * c.radius * y, c.low - distance);
    }
  }
  const std::vector<FieldAt> all = field_at(scene, currents, points);
  return *std::max_element(all.begin(), all.end(), [](const FieldAt& a, const FieldAt& b) {
    return a.public_share < b.public_share;
  });
}

std::string field_caution() {
  return "Estimate from thin turns in still air against the reference levels of ICNIRP 2010; metal and "
         "ferrite nearby change "
         "it. Above 100 kHz heating-based levels apply as well. It is no compliance test: that takes a "
         "measurement by "
         "the method and the limits of the place of use, and people with implanted devices need their own "
         "assessment.";
}

}  // namespace couplet::coil
