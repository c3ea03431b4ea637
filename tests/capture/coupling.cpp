// SPDX-License-Identifier: MIT
#include "engine/capture/coupling.h"

#include <functional>

#include "tests/agrees.h"
#include "tests/capture/synthetic.h"

namespace couplet::capture {
namespace {

using couplet::test::agrees;
using couplet::test::Tolerance;
using test::Chance;

const Tolerance round_off{1e-12, 0, "closed form, round-off"};

/// Exact readings of a pair, each with the same relative error.
struct Pair {
  double k, first, second, error;
  OpenShort open_short() const { return {{first, error}, {first * (1 - k * k), error}, 1e9}; }
  AidingOpposing aiding_opposing() const {
    const double mutual = k * std::sqrt(first * second);
    return {{first + second + 2 * mutual, error},
            {first + second - 2 * mutual, error},
            {first, error},
            {second, error}};
  }
  VoltageRatio voltage_ratio() const {
    return {{3, error}, {3 * k * std::sqrt(second / first), error}, {first, error}, {second, error}};
  }
  SplitResonances split(double a, double b) const {
    // (1 - k^2) x^2 - (a^2 + b^2) x + a^2 b^2 = 0 in x = f^2.
    const double half = (a * a + b * b) / 2;
    const double root = std::sqrt(half * half - (1 - k * k) * a * a * b * b);
    return {{std::sqrt((half - root) / (1 - k * k)), error},
            {std::sqrt((half + root) / (1 - k * k)), error},
            {a, error},
            {b, error}};
  }
};

TEST_CASE("every method returns the coupling of exact readings") {
  for (const double k : {0.02, 0.1, 0.3, 0.5, 0.9}) {
    const Pair pair{k, 24e-6, 15e-6, 0.01};
    const Tolerance difference{1e-9, 0, "differences of close numbers: round-off over k^2"};
    CHECK(agrees(open_short(pair.open_short()).k, k, difference));
    CHECK(agrees(aiding_opposing(pair.aiding_opposing()).k, k, difference));
    CHECK(agrees(voltage_ratio(pair.voltage_ratio()).k, k, round_off));
    CHECK(agrees(split_resonances(pair.split(140e3, 140e3)).k, k, difference));
    CHECK(agrees(split_resonances(pair.split(140e3, 143e3)).k, k, difference));
  }
  // Two equal lossless tanks: f0/sqrt(1 + k) and f0/sqrt(1 - k) (closed form). 140 kHz at k = 0.3 splits to
  // 123 and 167 kHz.
  const SplitResonances split = Pair{0.3, 1, 1, 0}.split(140e3, 140e3);
  CHECK(agrees(split.low.value, 140e3 / std::sqrt(1.3), round_off));
  CHECK(agrees(split.high.value, 140e3 / std::sqrt(0.7), round_off));
}

TEST_CASE("errors of 1 % readings of equal coils are those of the usual table") {
  // Common practice, first-order propagation: open/short 70, 7, 2 %; aiding/opposing 7, 3, 2 %; voltage
  // ratio 1.6 % (with 1 % voltages as well).
  struct Line {
    double k, open_short, aiding_opposing;
  };
  for (const Line& line : {Line{0.1, 70, 7}, Line{0.3, 7, 3}, Line{0.5, 2, 2}}) {
    const Pair pair{line.k, 24e-6, 24e-6, 0.01};
    const Tolerance printed{0, 0.5, "the table is printed in whole percent"};
    CHECK(agrees(100 * open_short(pair.open_short()).error / line.k, line.open_short, printed));
    CHECK(
        agrees(100 * aiding_opposing(pair.aiding_opposing()).error / line.k, line.aiding_opposing, printed));
    CHECK(
        agrees(100 * voltage_ratio(pair.voltage_ratio()).error / line.k, 1.6, {0, 0.05, "printed to 0.1 %"}));
  }
}

TEST_CASE("first-order errors agree with a Monte Carlo of the readings") {
  Chance chance(9);
  const int draws = 20000;
  const auto noisy = [&](Reading reading) {
    reading.value *= 1 + reading.error * chance.normal();
    return reading;
  };
  // The standard deviation of 20,000 draws scatters by 0.5 %; terms of second order stay below 2 % at these
  // errors.
  const Tolerance scatter{0.04, 0, "scatter of the draws and second-order terms"};
  for (const double k : {0.1, 0.3, 0.5}) {
    const Pair pair{k, 24e-6, 15e-6, 0.0005};
    const auto spread = [&](const std::function<double()>& draw) {
      double sum = 0;
      double squares = 0;
      for (int i = 0; i < draws; ++i) {
        const double value = draw() - k;
        sum += value;
        squares += value * value;
      }
      return std::sqrt(squares / draws - sum * sum / draws / draws);
    };
    const OpenShort a = pair.open_short();
    CHECK(agrees(spread([&] {
                   return open_short({noisy(a.open), noisy(a.shorted), 1e9}).k;
                 }),
                 open_short(a).error, scatter));
    const AidingOpposing b = pair.aiding_opposing();
    CHECK(agrees(
        spread([&] {
          return aiding_opposing({noisy(b.aiding), noisy(b.opposing), noisy(b.first), noisy(b.second)}).k;
        }),
        aiding_opposing(b).error, scatter));
    const VoltageRatio c = pair.voltage_ratio();
    CHECK(agrees(spread([&] {
                   return voltage_ratio({noisy(c.first_voltage), noisy(c.second_voltage), noisy(c.first),
                                         noisy(c.second)})
                       .k;
                 }),
                 voltage_ratio(c).error, scatter));
    const SplitResonances d = pair.split(140e3, 160e3);  // far apart: their own errors count
    CHECK(agrees(spread([&] {
                   return split_resonances(
                              {noisy(d.low), noisy(d.high), noisy(d.first_alone), noisy(d.second_alone)})
                       .k;
                 }),
                 split_resonances(d).error, scatter));
  }
}

TEST_CASE("redundant readings are held against each other") {
  // AF5LA, "Experiments with Mutual Inductance": two loops read at 100 kHz, 1.67 and 1.025 uH alone, 3.337
  // and 1.992 uH in series.
  AidingOpposing loops{{3.337e-6, 0.01}, {1.992e-6, 0.01}, {1.67e-6, 0.01}, {1.025e-6, 0.01}};
  CHECK(agrees(aiding_opposing(loops).k, 0.257, {0, 0.0005, "printed to three digits"}));
  const Consistency fair = check_inductances(loops);
  CHECK(agrees(100 * fair.miss, -1.1, {0, 0.05, "stated to 0.1 %"}));
  CHECK(fair.consistent);
  CHECK(aiding_opposing(loops).warnings.empty());
  for (Reading* reading : {&loops.aiding, &loops.opposing, &loops.first, &loops.second})
    reading->error = 0.002;
  CHECK_FALSE(check_inductances(loops).consistent);
  CHECK_THAT(aiding_opposing(loops).warnings.at(0), Catch::Contains("-1.13 %"));

  const Pair pair{0.1, 24e-6, 24e-6, 0.01};
  const std::vector<CouplingFactor> answers{open_short(pair.open_short()),
                                            aiding_opposing(pair.aiding_opposing()),
                                            voltage_ratio(pair.voltage_ratio())};
  CHECK(choose(answers).best == 2);
  CHECK(choose(answers).agree);
  std::vector<CouplingFactor> wrong = answers;
  wrong[1].k = 0.15;
  CHECK_FALSE(choose(wrong).agree);
  CHECK_THAT(choose(wrong).sentence, Catch::Contains("aiding / opposing (0.15) differs"));
  CHECK_FALSE(choose({}).agree);
}

TEST_CASE("the better method is named before measuring") {
  // Frequencies are read far better than inductances: the split wins; without a counter the voltage ratio.
  CHECK(plan_methods(0.1, 24e-6, 24e-6, 0.01, 0.01, 1e-4).front().method == "split resonances");
  CHECK(plan_methods(0.1, 24e-6, 24e-6, 0.01, 0.005, 0.05).front().method == "voltage ratio");
  CHECK(plan_methods(0.1, 24e-6, 24e-6, 0.01, 0.01, 1e-4).back().method == "open / short");
  CHECK(plan_methods(0.9, 24e-6, 24e-6, 0.01, 0.05, 0.05).front().method == "open / short");
}

TEST_CASE("impossible readings of coupling are refused with the reason") {
  CHECK_THAT(open_short({{1e-6, 0.01}, {1.1e-6, 0.01}}).problem, Catch::Contains("not below the open one"));
  CHECK_THAT(open_short({{0, 0.01}, {1e-6, 0.01}}).problem, Catch::Contains("above zero"));
  CHECK_THAT(aiding_opposing({{2, 0.01}, {3, 0.01}, {1, 0.01}, {1, 0.01}}).problem, Catch::Contains("swap"));
  CHECK_THAT(voltage_ratio({{1, 0.01}, {3, 0.01}, {1, 0.01}, {1, 0.01}}).problem, Catch::Contains("above 1"));
  CHECK_THAT(voltage_ratio({{1, 3}, {3, 0.01}, {1, 0.01}, {1, 0.01}}).problem,
             Catch::Contains("from 0 to 1"));
  CHECK_THAT(split_resonances({{140e3, 0}, {141e3, 0}, {139e3, 0}, {142e3, 0}}).problem,
             Catch::Contains("no coupling"));
  CHECK_THAT(split_resonances({{140e3, 0}, {130e3, 0}, {139e3, 0}, {142e3, 0}}).problem,
             Catch::Contains("above the lower"));
  const SplitResonances hidden{{139e3, 0}, {141e3, 0}, {140e3, 0}, {140e3, 0}, 30, 40};
  CHECK_THAT(split_resonances(hidden).warnings.at(0), Catch::Contains("losses hide the split"));
  // A shorted coil with resistance: Q of 2 lets L fall by 0.8 k^2 only.
  CHECK(agrees(open_short({{1, 0.01}, {1 - 0.8 * 0.09, 0.01}, 2}).k, 0.3, round_off));
}

}  // namespace
}  // namespace couplet::capture
