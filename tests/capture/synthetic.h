// SPDX-License-Identifier: MIT
// Captures with known truth, from fixed seeds.
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <random>
#include <vector>

namespace couplet::capture::test {

/// Numbers that are the same with every standard library.
class Chance {
 public:
  explicit Chance(std::uint64_t seed) : engine_(seed) {}
  double uniform(double low, double high) {
    return low + (high - low) * static_cast<double>(engine_() >> 11U) * 0x1p-53;
  }
  double decades(double low, double high) { return std::exp(uniform(std::log(low), std::log(high))); }
  double normal() {
    const double r = std::sqrt(-2 * std::log(uniform(1e-300, 1)));
    return r * std::cos(uniform(0, 2 * std::numbers::pi));
  }

 private:
  std::mt19937_64 engine_;
};

struct Tank {
  double frequency = 140e3;  // damped [Hz]
  double damping = 5e3;      // [1/s]
  double amplitude = 1, phase = 0;
};

struct Scene {
  std::vector<Tank> tanks{Tank{}};
  std::size_t points = 1000;
  double interval = 0.5e-6;  // [s]
  double before = 0;         // quiet time ahead of the start [s]
  double noise = 0;          // rms
  double offset = 0;
  double step = 0;  // of the quantisation; 0: none
};

struct Record {
  std::vector<double> time, value;
};

inline Record record(const Scene& scene, Chance& chance, double origin = 0) {
  Record out;
  for (std::size_t i = 0; i < scene.points; ++i) {
    const double t = scene.interval * static_cast<double>(i) - scene.before;
    double value = scene.offset + scene.noise * chance.normal();
    for (const Tank& tank : scene.tanks) {
      if (t < 0) break;
      value += tank.amplitude * std::exp(-tank.damping * t) *
               std::cos(2 * std::numbers::pi * tank.frequency * t + tank.phase);
    }
    if (scene.step > 0) value = scene.step * std::round(value / scene.step);
    out.time.push_back(origin + t);
    out.value.push_back(value);
  }
  return out;
}

}  // namespace couplet::capture::test
