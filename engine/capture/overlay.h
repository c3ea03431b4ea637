// SPDX-License-Identifier: MIT
// A measured waveform laid over a computed one: the shift in time that makes them agree best, and figures of
// what disagreement is left. Nothing else is adjusted: neither amplitude nor frequency, so that both stay
// visible.
#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

namespace couplet::capture {

/// `time` [s] strictly increasing; `value` in one unit for both waveforms; NaN where there is none.
struct Waveform {
  std::vector<double> time, value;
};

struct OverlayOptions {
  std::optional<double> shift;  // [s], added to the measured time; without: searched
  bool offset = false;          // also take out a constant difference (AC coupling, probe offset)
};

struct Overlay {
  bool usable = false;
  std::string reason = "not run";  // why not usable; "" where it is
  double shift = 0;                // [s]: measured time + shift = computed time
  double offset = 0;               // [unit], taken from the measured values
  double begin = 0, end = 0;       // overlap, in computed time [s]
  std::size_t samples = 0;         // measured samples in the overlap
  double amplitude_ratio = 0;      // of the strongest oscillation, measured over computed
  double frequency_ratio = 0;      // likewise; 1 + 1e-3 is 0.1 % too fast
  double frequency = 0;            // of the computed one [Hz]
  double phase = 0;                // measured ahead of computed, mid-overlap, after the shift [degree]
  double rms = 0;                  // of measured - computed [unit]
  double relative_rms = 0;         // over the rms of the computed waveform about its mean
  double worst = 0;                // measured - computed, the largest in size [unit]
  double worst_at = 0;             // where, in computed time [s]
  std::vector<std::string> notes;
};

/// The shift is that of the largest correlation about the means (blind to gain and offset), searched over all
/// positions in which the shorter waveform lies at least half inside the longer one. A strictly periodic
/// waveform fits in many places: the one nearest to the given times is taken, and a note says so.
Overlay overlay(const Waveform& measured, const Waveform& computed, const OverlayOptions& options = {});

}  // namespace couplet::capture
