// SPDX-License-Identifier: MIT
// One turn as a thin closed line, the place of one coil against another, and what a turn does to a point in
// space. Everything in this room is SI: metres, amperes, henries, teslas, radians.
#pragma once

#include <Eigen/Dense>
#include <vector>

namespace couplet::coil {

inline constexpr double pi = 3.14159265358979323846;
inline constexpr double mu0 = 4e-7 * pi;  // H/m; the measured value differs by 1.3e-10 (relative)

using Point = Eigen::Vector3d;

/// A rounded rectangle in the plane z = `height` of its coil's own frame, run through counter-clockwise as
/// seen from +z. A circle where both half sizes and the corner are its radius.
struct Filament {
  double half_length = 0;  // along x, m
  double half_width = 0;   // along y, m
  double corner = 0;       // radius of the corners, m; 0: sharp
  double height = 0;       // z, m
  double turns = 1;  // how many turns this line stands for; a fraction for a last turn that is not whole

  bool circle() const { return corner == half_length && corner == half_width; }
  double length() const { return 4 * (half_length + half_width - 2 * corner) + 2 * pi * corner; }
};

inline Filament circular(double radius, double height = 0, double turns = 1) {
  return {radius, radius, radius, height, turns};
}

/// Maps a point of one coil's frame into another's: p -> turn p + shift. `turn` is orthogonal; its
/// determinant is -1 where the coil is seen in a mirror.
struct Pose {
  Eigen::Matrix3d turn = Eigen::Matrix3d::Identity();
  Point shift = Point::Zero();

  Point operator()(const Point& p) const { return turn * p + shift; }
  Pose operator*(const Pose& inner) const { return {turn * inner.turn, turn * inner.shift + shift}; }
  Pose inverse() const { return {turn.transpose(), -(turn.transpose() * shift)}; }
  /// True where both coils share their axis (and look along it, either way).
  bool coaxial() const;
};

/// Mutual inductance of two coaxial circles, H: J. C. Maxwell, A Treatise on Electricity and Magnetism
/// (1873), art. 701, evaluated by the arithmetic-geometric mean so that no digits are lost at any distance.
/// `distance` along the axis.
double coaxial_circles(double first_radius, double second_radius, double distance);

/// Vector potential of one ampere in the filament, Wb/m (the turns are NOT multiplied in).
Point vector_potential(const Filament& filament, const Point& at);
/// Magnetic flux density of one ampere in the filament, T (the turns are NOT multiplied in). Circles in
/// elliptic integrals, straight sides in closed form (Biot-Savart), corners by Gauss-Legendre to about 1e-9.
Point flux_density(const Filament& filament, const Point& at);

/// A straight side or a corner of a filament, counter-clockwise.
struct Piece {
  bool straight = true;
  Point from, to;     // of a straight side
  Point centre;       // of a corner, always a quarter circle
  double radius = 0;  // of a corner
  int quadrant = 0;   // of a corner: from quadrant * 90 degrees on

  double length() const { return straight ? (to - from).norm() : radius * pi / 2; }
  /// Position and direction at 0 <= s <= 1; the direction is d(position)/ds.
  void at(double s, Point& position, Point& direction) const;
};

/// All of a filament, what of it has y >= 0, or what has x >= 0 and y >= 0.
enum class Part { whole, half, quarter };

/// The sides and corners of a filament, in order.
std::vector<Piece> pieces(const Filament& filament, Part part = Part::whole);

/// The same as vector_potential(filament, at), with the pieces made once.
Point vector_potential(const std::vector<Piece>& outline, const Point& at);

/// Shortest distance from a point to the filament, m.
double distance(const Filament& filament, const Point& at);

}  // namespace couplet::coil
