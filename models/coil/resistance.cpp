// SPDX-License-Identifier: MIT
#include "models/coil/resistance.h"

#include <cmath>
#include <cstdio>

namespace couplet::coil {
namespace {

using Complex = std::complex<double>;
constexpr Complex j(0, 1);

/// x^2/(4 - x^2/(6 - x^2/(8 - ...))) = 2 - x J0(x)/J1(x), by Lentz's method (W. J. Lentz 1976; the fraction
/// follows from the recurrence of the Bessel functions, NIST DLMF 10.10). Converges for every complex x off
/// the zeros of J1.
Complex fraction(Complex x_squared) {
  if (std::abs(x_squared) == 0) return 0;
  constexpr double tiny = 1e-300;
  Complex value = tiny, c = value, d = 0;
  Complex top = x_squared;
  for (int n = 2; n < 200000; ++n) {
    const double bottom = 2 * n;
    d = bottom + top * d;
    c = bottom + top / c;
    if (std::abs(d) == 0) d = tiny;
    if (std::abs(c) == 0) c = tiny;
    d = 1.0 / d;
    const Complex factor = c * d;
    value *= factor;
    if (std::abs(factor - 1.0) < 1e-16) break;
    top = -x_squared;
  }
  return value;
}

/// x^2 with x = (1 - j) a/delta.
Complex argument_squared(double radius, double depth) { return -2.0 * j * radius * radius / (depth * depth); }

/// tanh(u)/u, also for u near zero and large.
Complex tanh_over(Complex u) {
  if (std::abs(u) < 1e-4) return 1.0 - u * u / 3.0;
  return (u.real() > 300 ? Complex(1) : std::tanh(u)) / u;
}

/// Polarisability per metre of a trace, m2. Field along its faces: a plate of its thickness, exact in one
/// dimension. Field through its face: the loss at low frequency is that of evenly spread currents, at high
/// frequency the strip keeps the field out (pi w^2/4); between them one time constant that joins both ends.
Complex plate_along(double width, double thickness, double depth) {
  return -width * thickness * (1.0 - tanh_over((1.0 + j) * thickness / (2 * depth)));
}
Complex plate_through(double width, double thickness, double depth) {
  const double q = 2 * width * thickness / (3 * pi * depth * depth);
  return -pi * width * width / 4 * (j * q / (1.0 + j * q));
}

}  // namespace

double copper_resistivity(double celsius) { return 1.7241e-8 * (1 + 0.00393 * (celsius - 20)); }

double skin_depth(double frequency, double resistivity) {
  return std::sqrt(resistivity / (pi * frequency * mu0));
}

std::complex<double> round_wire(double radius, double depth) {
  return 1.0 - fraction(argument_squared(radius, depth)) / 2.0;
}

std::complex<double> round_wire_across(double radius, double depth) {
  const Complex w = fraction(argument_squared(radius, depth));
  return w / (2.0 - w);  // J2/J0 = 2 J1/(x J0) - 1, without the cancellation
}

double dowell(double x, double m) {
  if (x < 1e-2) return 1 + (5 * m * m - 1) * x * x * x * x / 45;  // next term x^8
  const double skin =
      x > 300 ? 1 : (std::sinh(2 * x) + std::sin(2 * x)) / (std::cosh(2 * x) - std::cos(2 * x));
  const double layers = x > 300 ? 1 : (std::sinh(x) - std::sin(x)) / (std::cosh(x) + std::cos(x));
  return x * (skin + 2.0 / 3 * (m * m - 1) * layers);
}

double litz_in_window(double frequency, double resistivity, double turns, double strands, double d,
                      double breadth) {
  const double root = pi * (2 * pi * frequency) * mu0 * turns * strands * d * d * d / (resistivity * breadth);
  return 1 + root * root / 768;
}

OwnField own_field(const Coil& coil, const std::vector<Image>& mirrored) {
  OwnField field;
  bool symmetric = true;  // all circles on one axis: one point a turn is enough
  for (const Filament& f : coil.filaments) symmetric = symmetric && f.circle();
  for (const Image& image : mirrored) symmetric = symmetric && image.pose.coaxial();
  for (size_t i = 0; i < coil.filaments.size(); ++i) {
    const Filament& turn = coil.filaments[i];
    double in_plane = 0, along_axis = 0, length = 0;
    for (const Piece& piece : pieces(turn, symmetric || mirrored.empty() ? Part::quarter : Part::whole)) {
      // Middle points: the field is wanted to a percent, and the ends of a side say little about it.
      const int samples = symmetric ? 1 : piece.straight ? 6 : 3;
      for (int n = 0; n < samples; ++n) {
        Point at, direction;
        piece.at((n + 0.5) / samples, at, direction);
        Point b = Point::Zero();
        for (size_t k = 0; k < coil.filaments.size(); ++k)
          if (k != i) b += coil.filaments[k].turns * flux_density(coil.filaments[k], at);
        for (const Image& image : mirrored) {
          const Point seen = image.pose.inverse()(at);
          Point part = Point::Zero();
          for (const Filament& f : coil.filaments) part += f.turns * flux_density(f, seen);
          b += image.factor * image.pose.turn.determinant() * (image.pose.turn * part);
        }
        const double share = piece.length() / samples;
        const Point across = b - b.dot(direction) / direction.squaredNorm() * direction;
        along_axis += share * across.z() * across.z() / (mu0 * mu0);
        in_plane += share * (across.x() * across.x() + across.y() * across.y()) / (mu0 * mu0);
        length += share;
      }
    }
    field.in_plane.push_back(in_plane / length);
    field.along_axis.push_back(along_axis / length);
  }
  return field;
}

Resistance::Resistance(const Coil& coil, const std::vector<Image>& mirrored)
    : coil_(coil), field_(own_field(coil, mirrored)) {}

double Resistance::dc(double celsius) const {
  return copper_resistivity(celsius) * coil_.wire_length / coil_.conductor.copper_area();
}

std::complex<double> Resistance::impedance(double frequency, double celsius) const {
  const Conductor& c = coil_.conductor;
  const double depth = skin_depth(frequency, copper_resistivity(celsius));
  const double omega = 2 * pi * frequency;
  const bool trace = c.kind == Conductor::Kind::trace;
  const double radius = c.diameter / 2;
  const int strands = c.kind == Conductor::Kind::litz ? c.strands : 1;
  Complex z = dc(celsius);
  Complex along, through, strand;
  if (trace) {
    z *= 1.0 / tanh_over((1.0 + j) * c.thickness / (2 * depth));
    along = plate_along(c.width, c.thickness, depth), through = plate_through(c.width, c.thickness, depth);
  } else {
    z *= round_wire(radius, depth);
    strand = 2 * pi * radius * radius * strands * round_wire_across(radius, depth);
  }
  // Mean square of the field inside a bundle of evenly spread current: H = I r/(2 pi b^2), so I^2/(8 pi^2
  // b^2). A lone strand has no bundle around it.
  const double bundle_radius = c.bundle() / 2;
  const double bundle = strands > 1 ? 1 / (8 * pi * pi * bundle_radius * bundle_radius) : 0;
  const bool flat = coil_.across == c.width;
  for (size_t i = 0; i < coil_.filaments.size(); ++i) {
    const Filament& f = coil_.filaments[i];
    const double in_plane = field_.in_plane[i], axial = field_.along_axis[i];
    const Complex polarisability =
        trace ? along * (flat ? in_plane : axial) + through * (flat ? axial : in_plane)
              : strand * (in_plane + axial + bundle);
    z += j * omega * mu0 * f.turns * f.length() * polarisability;
  }
  return z;
}

Impedance Resistance::at(double frequency, double celsius) const {
  if (!(frequency > 0)) return {dc(celsius), 0};
  const Complex z = impedance(frequency, celsius);
  // Internal inductance of evenly spread current is in the geometric mean radius already: mu0/(8 pi) a metre
  // and strand for round wire, mu0 t/(12 w) for a trace with the current's field on both faces.
  const Conductor& c = coil_.conductor;
  const double internal = c.kind == Conductor::Kind::trace
                              ? mu0 * c.thickness / (12 * c.width)
                              : mu0 / (8 * pi) / (c.kind == Conductor::Kind::litz ? c.strands : 1);
  return {z.real(), z.imag() / (2 * pi * frequency) - internal * coil_.wire_length};
}

std::vector<std::string> Resistance::limits(double frequency, double celsius) const {
  std::vector<std::string> list;
  const Conductor& c = coil_.conductor;
  const double depth = skin_depth(std::max(frequency, 1e-3), copper_resistivity(celsius));
  char text[300];
  list.push_back(
      "resistance: copper alone, in the field of its own winding; losses in ferrite, plate, case and the "
      "other "
      "coil's copper are not counted.");
  if (c.kind == Conductor::Kind::litz && c.diameter > depth) {
    std::snprintf(
        text, sizeof text,
        "litz: the strand (%.3g mm) is thicker than the skin depth (%.3g mm); finer strands are usual.",
        c.diameter * 1e3, depth * 1e3);
    list.push_back(text);
  }
  if (c.kind == Conductor::Kind::litz)
    list.push_back("litz: strands taken as perfectly transposed; poor twisting adds loss.");
  if (c.kind == Conductor::Kind::trace && 2 * c.width * c.thickness > 3 * pi * depth * depth) {
    std::snprintf(text, sizeof text,
                  "trace: at %.4g kHz the current crowds to the edges of a %.3g mm trace; between the two "
                  "limits used here the "
                  "resistance is an estimate, good to perhaps 30 %% (common practice: measure).",
                  frequency / 1e3, c.width * 1e3);
    list.push_back(text);
  }
  return list;
}

}  // namespace couplet::coil
