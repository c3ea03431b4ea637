// SPDX-License-Identifier: MIT
// Ring-downs with a known capacitor -> inductance and resistance; two of them, with the second coil open and
// closed -> coupling factor and reflected resistance. What the noise of the capture makes unsure (95 %) is
// kept apart from what the stated tolerances of the given parts make unsure (worst case): averaging helps
// against the first only.
#pragma once

#include <string>

#include "engine/capture/ringdown.h"

namespace couplet::capture {

/// A stated value and how far it may be off, in the value's unit.
struct Stated {
  double value = 0, tolerance = 0;
};

/// The circuit around the coil: coil and series resistance in a loop with the capacitor; probe across the
/// capacitor.
struct KnownCapacitor {
  Stated capacitance;           // [F]
  Stated probe_capacitance;     // [F], adds to it
  Stated series_resistance;     // of capacitor, leads and switch [ohm], not the coil's
  double probe_resistance = 0;  // [ohm]; 0: none
};

struct PartValue {
  double value = 0;
  Estimate statistical;  // 95 % interval from the capture
  Estimate systematic;   // range while the given values go through their tolerances
};

struct CoilReading {
  std::string problem;   // empty: good
  PartValue inductance;  // [H]
  PartValue resistance;  // of the coil alone at its frequency [ohm]
  PartValue quality;     // of the coil alone, omega L / R
};

/// The loop's characteristic equation s^2 + s (R/L + G/C) + (1 + R G)/(L C) = 0 at s = -alpha +- i omega,
/// with C = capacitor + probe, G = 1 / probe resistance, R = coil + series resistance; solved for L and R in
/// closed form.
CoilReading read_coil(const RingDownMode& ring, const KnownCapacitor& capacitor);

struct CouplingReading {
  std::string problem;              // empty: good
  PartValue coupling;               // k
  PartValue reflected_resistance;   // [ohm]
  double reflected_inductance = 0;  // [H], negative: the closed coil takes inductance away
};

/// `alone`: ring of the first coil with the second one open; `closed`: with the second one shorted, or closed
/// by any resistance (no capacitor). Exact: with X(s) = -s^2 M^2 / (R2 + s L2) taken from the loop equation
/// at the second ring's s, k^2 = omega / (L1 Im(-s^2 / X)), whatever R2 is.
CouplingReading read_coupling(const RingDownMode& alone, const RingDownMode& closed,
                              const KnownCapacitor& capacitor);

}  // namespace couplet::capture
