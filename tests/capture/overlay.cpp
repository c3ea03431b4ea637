// SPDX-License-Identifier: MIT
#include "engine/capture/overlay.h"

#include <complex>

#include "tests/agrees.h"
#include "tests/capture/synthetic.h"

namespace couplet::capture {
namespace {

using couplet::test::agrees;
using test::Chance;

constexpr double f = 140e3;

/// A tank that builds up: not periodic, so that the place is unique. `late` moves it in time.
double rising(double t, double frequency = f) {
  return t < 0 ? 0 : 10 * (1 - std::exp(-t / 60e-6)) * std::sin(2 * std::numbers::pi * frequency * t);
}

Waveform sampled(double begin, double step, std::size_t points, double (*law)(double), double late = 0,
                 double gain = 1, double offset = 0, double noise = 0, Chance* chance = nullptr) {
  Waveform wave;
  for (std::size_t i = 0; i < points; ++i) {
    const double t = begin + step * static_cast<double>(i);
    wave.time.push_back(t);
    wave.value.push_back(gain * law(t - late) + offset + (chance ? noise * chance->normal() : 0));
  }
  return wave;
}

double start_up(double t) { return rising(t); }
double fast_start_up(double t) { return rising(t, 1.001 * f); }
double sine(double t) { return 3 * std::sin(2 * std::numbers::pi * f * t); }

TEST_CASE("a shifted, scaled, offset and noisy copy is laid over its original") {
  Chance chance(12);
  const Waveform computed = sampled(0, 25e-9, 16000, start_up);
  // Measured: its own clock (the trigger 37.3 us late), coarser steps, 8 % too large, 0.4 V offset.
  const Waveform measured = sampled(-20e-6, 90e-9, 3000, start_up, 37.3e-6, 1.08, 0.4, 0.05, &chance);
  const Overlay result = overlay(measured, computed, {{}, true});
  REQUIRE(result.usable);
  // 3000 samples of 0.05 V noise against slopes of 6 V/us rms: 0.05/6e6/sqrt(3000) = 0.15 ns.
  CHECK(agrees(result.shift, -37.3e-6,
               {0, 1e-9, "noise over slope, and straight lines between computed samples"}));
  CHECK(agrees(result.amplitude_ratio, 1.08, {1e-3, 0, "0.05 V of noise in 7 V over 3000 samples"}));
  CHECK(agrees(result.frequency_ratio, 1, {1e-5, 0, "noise; 37 cycles"}));
  CHECK(std::abs(result.phase) < 0.1);
  CHECK(agrees(result.offset, 0.4, {0, 0.01, "8 % of the mean of the overlap's ends, and noise"}));
  // What is left is 8 % of the waveform and the noise.
  CHECK(agrees(result.relative_rms, 0.08, {0.02, 0, "0.05 V of noise adds in squares"}));
  CHECK(std::abs(result.worst) > 0.7);
  CHECK(std::abs(result.worst) < 1.1);
  CHECK(agrees(result.begin, 0, {0, 1e-7, "one measured step"}));
}

TEST_CASE("figures of an overlay with given shift are those of the formula") {
  const Waveform computed = sampled(0, 20e-9, 5000, sine);
  const Waveform measured = sampled(0, 50e-9, 2000, sine, 0.2e-6, 0.9);
  const Overlay result = overlay(measured, computed, {0.0, false});
  REQUIRE(result.usable);
  CHECK(result.shift == 0);
  const double lag = 360 * f * 0.2e-6;
  // Straight lines between 357 samples a cycle fall short of a sine by (2 pi/357)^2/12 = 3e-5.
  const couplet::test::Tolerance lines{1e-4, 0, "straight lines between the computed samples"};
  CHECK(agrees(result.phase, -lag, lines));
  CHECK(agrees(result.amplitude_ratio, 0.9, lines));
  CHECK(agrees(result.frequency, f, lines));
  // |1 - 0.9 exp(-i lag)| of the amplitude; 14 whole cycles overlap.
  const double size = std::abs(1.0 - std::polar(0.9, lag * std::numbers::pi / 180));
  CHECK(agrees(result.relative_rms, size, {2e-3, 0, "the overlap ends within a cycle"}));
  CHECK(agrees(std::abs(result.worst), 3 * size, {1e-3, 0, "50 ns steps around the crest"}));
}

TEST_CASE("a wrong frequency, a periodic waveform and a stranger are told") {
  const Waveform computed = sampled(0, 25e-9, 16000, start_up);
  const Overlay fast = overlay(sampled(0, 50e-9, 6000, fast_start_up), computed);
  CHECK(agrees(fast.frequency_ratio, 1.001, {1e-5, 0, "two fits of a rising sine"}));
  const Overlay periodic = overlay(sampled(3e-6, 50e-9, 1000, sine, 0.5e-6), sampled(0, 20e-9, 20000, sine));
  REQUIRE(periodic.notes.size() == 1);
  CHECK_THAT(periodic.notes[0], Catch::Contains("periodic"));
  CHECK(agrees(periodic.shift, -0.5e-6, {0, 1e-9, "straight lines between samples"}));
  Chance chance(4);
  const Overlay stranger = overlay(sampled(
                                       0, 50e-9, 3000, [](double) { return 0.0; }, 0, 1, 0, 20, &chance),
                                   computed);
  CHECK(stranger.relative_rms > 1);
  CHECK_FALSE(stranger.notes.empty());
}

TEST_CASE("waveforms that cannot be compared are refused") {
  const Waveform computed = sampled(0, 25e-9, 16000, start_up);
  CHECK_THAT(overlay({{0, 1}, {0, 1}}, computed).reason, Catch::Contains("fewer than 8"));
  CHECK_THAT(overlay(sampled(0, 1e-7, 100, [](double) { return 1.0; }), computed).reason,
             Catch::Contains("flat"));
  CHECK_THAT(overlay(sampled(0, 1e-7, 100, sine), computed, {1.0, false}).reason,
             Catch::Contains("only 0 measured"));
  Waveform back = sampled(0, 1e-7, 100, sine);
  std::reverse(back.time.begin(), back.time.end());
  CHECK_THAT(overlay(back, computed).reason, Catch::Contains("do not increase"));
}

}  // namespace
}  // namespace couplet::capture
