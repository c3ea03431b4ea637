// SPDX-License-Identifier: MIT
// Closed expressions from the literature, to hold the computed values against. None of them is used to
// compute.
#pragma once

namespace couplet::coil::handbook {

/// Planar spirals, H: current-sheet expression of S. S. Mohan, M. del Mar Hershenson, S. P. Boyd, T. H. Lee,
/// IEEE J. Solid-State Circuits 34 (1999) 1419, table 2; good to 2 to 3 % by the authors' account. Diameters
/// over copper, m.
double spiral_circle(double turns, double outer, double inner);
double spiral_square(double turns, double outer, double inner);
/// The modified Wheeler expression of the same paper (table 1) for a square, H.
double spiral_square_wheeler(double turns, double outer, double inner);
/// H. A. Wheeler, Proc. IRE 16 (1928) 1398: flat spiral r^2 n^2/(8 r + 11 c) uH, lengths in inches; mean
/// radius r and radial depth c in m here. Good to 5 % for c > 0.2 r, by his account. From memory.
double spiral_wheeler(double turns, double mean_radius, double depth);
/// The same paper: single layer r^2 n^2/(9 r + 10 l) uH, to 1 % for l > 0.8 r. From memory.
double solenoid_wheeler(double turns, double radius, double length);
/// The same paper: multilayer 0.8 r^2 n^2/(6 r + 9 l + 10 c) uH, to 1 % where the three terms are alike. From
/// memory.
double multilayer_wheeler(double turns, double mean_radius, double length, double depth);

/// Nagaoka's coefficient (H. Nagaoka, J. Coll. Sci. Tokyo 27 (1909) 1) of a cylindrical current sheet, exact.
double nagaoka(double diameter_over_length);
/// Cylindrical current sheet, H.
double solenoid_sheet(double turns, double diameter, double length);

/// Circular loop of round wire, H, current evenly spread (7/4) (F. W. Grover 1946, ch. 16).
double loop(double radius, double wire_radius);
/// Square of round wire, H: (2 mu0 s/pi)(ln(s/a) - 0.52401), terms linear in a/s left out (Grover 1946, ch.
/// 8).
double square(double side, double wire_radius);
/// Two equal coaxial squares, H, exact (Grover 1946, ch. 8).
double coaxial_squares(double side, double distance);

/// Two coaxial dipoles far apart, H: mu0 pi a^2 b^2/(2 d^3).
double dipoles(double first_radius, double second_radius, double distance);
/// Two equal coaxial loops close together, H: mu0 a (ln(8 a/d) - 2) (J. C. Maxwell 1864).
double near_loops(double radius, double distance);

}  // namespace couplet::coil::handbook
