// SPDX-License-Identifier: MIT
// Winding resistance: at dc, and with the currents that an alternating field drives in the conductor itself
// (skin effect) and that the neighbouring turns drive in it (proximity effect). Both are used as complex
// impedances, so that R(f) and L(f) belong to one passive law.
#pragma once

#include <complex>
#include <string>
#include <vector>

#include "models/coil/plane.h"

namespace couplet::coil {

/// Annealed copper, ohm m, temperature in degC: 1.7241e-8 at 20 degC and 0.00393 per kelvin (IEC 60028).
double copper_resistivity(double celsius);

/// Depth at which a plane wave has fallen to 1/e, m: sqrt(2 rho/(omega mu0)).
double skin_depth(double frequency, double resistivity);

/// Impedance of a lone round wire over its dc resistance: (x/2) J0(x)/J1(x), x = (1 - j) a/delta (Lord Kelvin
/// 1889; S. Ramo, J. R. Whinnery, T. Van Duzer, Fields and Waves). Real part Rac/Rdc; the imaginary part
/// times Rdc is omega times the internal inductance. Exact for any size.
std::complex<double> round_wire(double radius, double skin_depth);

/// Transverse polarisability of a round wire over 2 pi a^2: J2(x)/J0(x). A field H (rms) across the wire then
/// adds, for each metre, the complex power j omega mu0 2 pi a^2 H^2 J2/J0. Its real part is Ferreira's
/// proximity loss (J. A. Ferreira, IEEE Trans. Power Electron. 9 (1994) 127), exact in a uniform field.
std::complex<double> round_wire_across(double radius, double skin_depth);

/// Layers of foil with the field on one side building up: Rac/Rdc of m layers of thickness x skin depths,
/// mean over the layers (P. L. Dowell, Proc. IEE 113 (1966) 1387).
double dowell(double thickness_in_skin_depths, double layers);

/// Litz in a window of breadth b whose field rises evenly across the winding:
/// 1 + pi^2 omega^2 mu0^2 N^2 n^2 d^6/(768 rho^2 b^2) (C. R. Sullivan, IEEE Trans. Power Electron. 14 (1999)
/// 283, from memory; it is what pi omega^2 B^2 d^4/(128 rho) per metre of strand sums up to, and the
/// low-frequency limit of round_wire_across). True while the strand is thinner than the skin depth.
double litz_in_window(double frequency, double resistivity, double turns, double strands,
                      double strand_diameter, double breadth);

/// Field of one ampere in the winding, at its own conductors, without that of the turn itself: squares of H
/// averaged along the turns, 1/m2 (A2/m2 for 1 A). Images in sheets are counted in the winding's own frame.
struct OwnField {
  std::vector<double> in_plane,
      along_axis;  // for each filament: square of H in the turn's plane, and along the axis
};
OwnField own_field(const Coil& coil, const std::vector<Image>& mirrored = {});

struct Impedance {
  double resistance = 0;         // ohm
  double inductance_change = 0;  // H, against the current spread evenly (negative)
};

/// Computes R and L against frequency for one winding; the field is computed once.
class Resistance {
 public:
  explicit Resistance(const Coil& coil, const std::vector<Image>& mirrored = {});

  double dc(double celsius) const;
  /// Round wire: Bessel and Ferreira, exact for a lone wire and in a uniform field. Litz: the same for each
  /// strand, which also sits in the field of its own bundle. Trace: foil of its thickness for the skin
  /// effect; across it the low-frequency loss with the limit of a perfectly conducting strip at high
  /// frequency (see limits()).
  Impedance at(double frequency, double celsius) const;
  /// Sentences on what the value leaves out at this frequency.
  std::vector<std::string> limits(double frequency, double celsius) const;

 private:
  std::complex<double> impedance(double frequency, double celsius) const;
  Coil coil_;
  OwnField field_;
};

}  // namespace couplet::coil
