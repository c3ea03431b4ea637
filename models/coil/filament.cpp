// SPDX-License-Identifier: MIT
#include "models/coil/filament.h"

#include <algorithm>
#include <array>
#include <cmath>

namespace couplet::coil {
namespace {

/// Sums of the arithmetic-geometric mean of a circle of radius a seen from (rho, z), after one step taken in
/// closed form: with s = a^2 + rho^2 + z^2 and p = sqrt(s^2 - 4 a^2 rho^2): a1^2 = (s + p)/2, b1^2 = p, c1^2
/// = 2 a^2 rho^2/(s + p). (1 - k^2/2) K - E is then K times the sum over n >= 1 of 2^(n-1) (c_n/a_0)^2: all
/// terms positive, nothing cancels.
struct Mean {
  double limit;  // the mean, m
  double sum;    // sum of 2^(n-1) c_n^2 over n >= 1, divided by rho^2
  double p;      // product of the smallest and the largest distance to the circle, m^2
};

inline Mean mean(double a, double rho_squared, double z) {
  const double z_squared = z * z;
  const double inner = rho_squared + z_squared - a * a;
  const double p = std::sqrt(inner * inner + 4 * a * a * z_squared);
  const double s = a * a + rho_squared + z_squared;
  double large = std::sqrt(0.5 * (s + p)), small = std::sqrt(p);
  double term = 2 * a * a / (s + p);  // c_n^2 / rho^2
  double sum = term, weight = 1;
  for (int step = 0; step < 40; ++step) {
    const double next = 0.5 * (large + small);
    small = std::sqrt(large * small);
    large = next;
    // c_(n+1) = c_n^2 / (4 a_(n+1))
    term = term * (term * rho_squared) / (16 * large * large);
    weight *= 2;
    const double add = weight * term;
    sum += add;
    if (add <= 1e-17 * sum) break;
  }
  return {large, sum, p};
}

struct Rule {
  std::array<double, 8> place, weight;  // on 0..1
};

/// Gauss-Legendre with 8 points (M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions,
/// table 25.4).
const Rule& rule() {
  static const Rule made = [] {
    const std::array<double, 4> x = {0.1834346424956498, 0.5255324099163290, 0.7966664774136267,
                                     0.9602898564975363};
    const std::array<double, 4> w = {0.3626837833783620, 0.3137066458778873, 0.2223810344533745,
                                     0.1012285362903763};
    Rule r{};
    for (int i = 0; i < 4; ++i) {
      r.place[2 * i] = 0.5 * (1 - x[i]), r.place[2 * i + 1] = 0.5 * (1 + x[i]);
      r.weight[2 * i] = r.weight[2 * i + 1] = 0.5 * w[i];
    }
    return r;
  }();
  return made;
}

/// The eight points of each of the 1, 2, 4, ... equal stretches of a quarter circle, as cosine and sine:
/// computed once, since every corner of every filament is a quarter circle.
struct QuarterCircle {
  static constexpr int levels = 12;
  struct Node {
    double cosine, sine;
  };
  std::vector<std::array<Node, 9>> stretches;  // the ninth is the middle; stretch i of level n at 2^n - 1 + i
  QuarterCircle() {
    for (int level = 0; level < levels; ++level) {
      const int count = 1 << level;
      for (int i = 0; i < count; ++i) {
        std::array<Node, 9> nodes;
        for (int n = 0; n < 9; ++n) {
          const double angle = pi / 2 * (i + (n < 8 ? rule().place[n] : 0.5)) / count;
          nodes[n] = {std::cos(angle), std::sin(angle)};
        }
        stretches.push_back(nodes);
      }
    }
  }
};

/// Integral of `kernel(position, direction)` along a corner. A stretch is halved until the point is further
/// from its middle than 1.5 times its length; eight points then leave 1e-10 of it.
template <class Kernel>
void along_corner(const Piece& piece, const Point& at, int level, int stretch, const Kernel& kernel,
                  Point& sum) {
  static const QuarterCircle quarter;
  const auto& nodes = quarter.stretches[(1 << level) - 1 + stretch];
  const double turn_cosine = std::array{1, 0, -1, 0}[piece.quadrant],
               turn_sine = std::array{0, 1, 0, -1}[piece.quadrant];
  const auto radial = [&](const QuarterCircle::Node& n) {
    return Point(turn_cosine * n.cosine - turn_sine * n.sine, turn_sine * n.cosine + turn_cosine * n.sine, 0);
  };
  const double length = piece.length() / (1 << level);
  const Point middle = piece.centre + piece.radius * radial(nodes[8]);
  if (level + 1 < QuarterCircle::levels && (at - middle).squaredNorm() < 2.25 * length * length) {
    along_corner(piece, at, level + 1, 2 * stretch, kernel, sum);
    along_corner(piece, at, level + 1, 2 * stretch + 1, kernel, sum);
    return;
  }
  for (int i = 0; i < 8; ++i) {
    const Point out = radial(nodes[i]);
    sum += rule().weight[i] * length *
           kernel(Point(piece.centre + piece.radius * out), Point(-out.y(), out.x(), 0));
  }
}

/// Closed form of the potential of a straight wire: (mu0/4 pi) 2 artanh(l/(r1 + r2)) along the wire.
Point side_potential(const Piece& piece, const Point& at) {
  const Point along = piece.to - piece.from;
  const double length = along.norm();
  const double distances = (at - piece.from).norm() + (at - piece.to).norm();
  return (mu0 / (2 * pi)) * std::atanh(std::min(length / distances, 1 - 1e-16)) / length * along;
}

Point side_flux_density(const Piece& piece, const Point& at) {
  const Point first = at - piece.from, second = at - piece.to;
  const double r1 = first.norm(), r2 = second.norm();
  return (mu0 / (4 * pi)) * (r1 + r2) / (r1 * r2 * (r1 * r2 + first.dot(second))) * first.cross(second);
}

/// Bz = (mu0/(2 pi a0)) (K + (a^2 - rho^2 - z^2)/b0^2 E); Brho likewise (W. R. Smythe, Static and Dynamic
/// Electricity, 7.10), written with the sum S of Mean so that the axis is no special place.
Point circle_flux_density(const Filament& filament, const Point& at) {
  const double a = filament.corner, z = at.z() - filament.height;
  const double rho_squared = at.x() * at.x() + at.y() * at.y(), rho = std::sqrt(rho_squared);
  const Mean m = mean(a, rho_squared, z);
  const double far_squared = (a + rho) * (a + rho) + z * z, near_squared = (a - rho) * (a - rho) + z * z;
  const double s = m.sum / far_squared;          // S / rho^2
  const double k_over_far = pi / (2 * m.limit);  // K / a0
  const double e_over_k = 1 - 2 * a * rho / far_squared - s * rho_squared;
  const double bz =
      mu0 / (2 * pi) * k_over_far * (1 + (a * a - rho_squared - z * z) / near_squared * e_over_k);
  const double radial = mu0 * z / (2 * pi) * k_over_far *
                        (4 * a * a / (far_squared * near_squared) - s * (1 + 2 * a * rho / near_squared));
  return {radial * at.x(), radial * at.y(), bz};
}

}  // namespace

bool Pose::coaxial() const {
  const double scale = std::abs(shift.z()) + 1e-6;
  return std::hypot(shift.x(), shift.y()) < 1e-12 * scale && std::hypot(turn(0, 2), turn(1, 2)) < 1e-13;
}

double coaxial_circles(double first_radius, double second_radius, double distance) {
  const Mean m = mean(first_radius, second_radius * second_radius, distance);
  return mu0 * pi / (2 * m.limit) * m.sum * second_radius * second_radius;
}

void Piece::at(double s, Point& position, Point& direction) const {
  if (straight) {
    direction = to - from;
    position = from + s * direction;
    return;
  }
  const double angle = (quadrant + s) * pi / 2, c = std::cos(angle), n = std::sin(angle);
  position = centre + radius * Point(c, n, 0);
  direction = radius * pi / 2 * Point(-n, c, 0);
}

std::vector<Piece> pieces(const Filament& f, Part part) {
  const double x = f.half_length, y = f.half_width, c = f.corner, z = f.height;
  std::vector<Piece> list;
  const auto side = [&](double x1, double y1, double x2, double y2) {
    if (x1 != x2 || y1 != y2) list.push_back({true, {x1, y1, z}, {x2, y2, z}, Point::Zero(), 0, 0});
  };
  const auto bend = [&](double cx, double cy, int quadrant) {
    if (c > 0) list.push_back({false, Point::Zero(), Point::Zero(), {cx, cy, z}, c, quadrant});
  };
  const bool whole = part == Part::whole;
  side(x, whole ? c - y : 0, x, y - c);
  bend(x - c, y - c, 0);
  side(x - c, y, part == Part::quarter ? 0 : c - x, y);
  if (part == Part::quarter) return list;
  bend(c - x, y - c, 1);
  side(-x, y - c, -x, whole ? c - y : 0);
  if (part == Part::half) return list;
  bend(c - x, c - y, 2);
  side(c - x, -y, x - c, -y);
  bend(x - c, c - y, 3);
  return list;
}

Point vector_potential(const Filament& filament, const Point& at) {
  if (!filament.circle()) return vector_potential(pieces(filament), at);
  const Mean m = mean(filament.corner, at.x() * at.x() + at.y() * at.y(), at.z() - filament.height);
  const double over_rho = mu0 / 4 * m.sum / m.limit;
  return {-over_rho * at.y(), over_rho * at.x(), 0};
}

Point vector_potential(const std::vector<Piece>& outline, const Point& at) {
  Point sides = Point::Zero(), corners = Point::Zero();
  const auto kernel = [&](const Point& p, const Point& d) -> Point { return d / (at - p).norm(); };
  for (const Piece& piece : outline) {
    if (piece.straight)
      sides += side_potential(piece, at);
    else
      along_corner(piece, at, 0, 0, kernel, corners);
  }
  return sides + mu0 / (4 * pi) * corners;
}

Point flux_density(const Filament& filament, const Point& at) {
  if (filament.circle()) return circle_flux_density(filament, at);
  Point sides = Point::Zero(), corners = Point::Zero();
  const auto kernel = [&](const Point& p, const Point& d) -> Point {
    const Point r = at - p;
    const double n = r.norm();
    return d.cross(r) / (n * n * n);
  };
  for (const Piece& piece : pieces(filament)) {
    if (piece.straight)
      sides += side_flux_density(piece, at);
    else
      along_corner(piece, at, 0, 0, kernel, corners);
  }
  return sides + mu0 / (4 * pi) * corners;
}

double distance(const Filament& f, const Point& at) {
  if (f.circle()) {
    const double beside = std::sqrt(at.x() * at.x() + at.y() * at.y()) - f.corner, above = at.z() - f.height;
    return std::sqrt(beside * beside + above * above);
  }
  const double x = std::abs(at.x()) - (f.half_length - f.corner),
               y = std::abs(at.y()) - (f.half_width - f.corner);
  const double outside =
      std::hypot(std::max(x, 0.0), std::max(y, 0.0)) + std::min(std::max(x, y), 0.0) - f.corner;
  return std::hypot(outside, at.z() - f.height);
}

}  // namespace couplet::coil
