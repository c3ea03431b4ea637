// SPDX-License-Identifier: MIT
// What a placement and a map of placements cost. The two flat coils of ten turns are invented.
#include <algorithm>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <cstring>

#include "models/coil/placement.h"
#include "models/coil/self.h"

using namespace couplet::coil;

namespace {

double seconds() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

Winding flat(double outer, double inner, bool rectangular) {
  Winding w;
  w.turns = 10, w.conductor.diameter = 0.5e-3;
  if (rectangular) {
    w.shape = Shape::flat_rectangular;
    w.outer_length = outer, w.outer_width = 0.8 * outer, w.inner_length = inner,
    w.corner_radius = 0.2 * outer;
  } else {
    w.outer_diameter = outer, w.inner_diameter = inner;
  }
  return w;
}

}  // namespace

int main(int count, char** words) {
  const bool quick = count > 1 && !std::strcmp(words[1], "--quick");
  std::printf("mutual inductance of two flat 10-turn coils, one placement (gap 4 mm)\n");
  std::printf("%-14s %10s %10s %12s %14s %12s\n", "coils", "shift mm", "tilt deg", "M uH", "against 1e-12",
              "time ms");
  for (const bool rectangular : {false, true}) {
    const Coil one = build(flat(0.043, 0.0205, rectangular)), two = build(flat(0.040, 0.020, rectangular));
    for (const auto& [shift, tilt] : {std::pair{0.0, 0.0}, {0.008, 0.0}, {0.008, 5.0}, {0.03, 0.0}}) {
      const Pose p = pose(one, two, {0.004, shift, 0, tilt * pi / 180});
      const int repeat = quick ? 1 : rectangular ? 5 : 50;
      const double start = seconds();
      double value = 0;
      for (int i = 0; i < repeat; ++i) value = mutual(one, two, p, 1e-6).value;
      const double each = (seconds() - start) / repeat;
      const double exact = mutual(one, two, p, quick ? 1e-8 : 1e-12).value;
      std::printf("%-14s %10.1f %10.1f %12.6f %14.1e %12.3f\n", rectangular ? "rectangular" : "round",
                  shift * 1e3, tilt, value * 1e6, std::abs(value / exact - 1), each * 1e3);
    }
  }
  const Coil one = build(flat(0.043, 0.0205, false)), two = build(flat(0.040, 0.020, false));
  const int steps = quick ? 6 : 30;
  const double start = seconds();
  double smallest = 1, largest = -1;
  const double scale = std::sqrt(self_inductance(one).value * self_inductance(two).value);
  for (int i = 0; i < steps; ++i)
    for (int j = 0; j < steps; ++j) {
      const Placement place{1e-3 + 19e-3 * i / (steps - 1), 20e-3 * j / (steps - 1), 0, 0};
      const double k = mutual(one, two, pose(one, two, place), 1e-6).value / scale;
      smallest = std::min(smallest, k), largest = std::max(largest, k);
    }
  std::printf("map of %d gaps (1 to 20 mm) by %d shifts (0 to 20 mm): k %.4f to %.4f, %.3f s\n", steps, steps,
              smallest, largest, seconds() - start);
  return 0;
}
