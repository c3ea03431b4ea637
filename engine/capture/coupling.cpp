// SPDX-License-Identifier: MIT
#include "engine/capture/coupling.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <initializer_list>
#include <utility>

namespace couplet::capture {
namespace {

/// Root of the sum of squares of slope times absolute error.
double combine(std::initializer_list<double> parts) {
  double sum = 0;
  for (const double part : parts) sum += part * part;
  return std::sqrt(sum);
}

std::string bad_readings(std::initializer_list<std::pair<const char*, Reading>> readings) {
  for (const auto& [name, reading] : readings) {
    if (!(reading.value > 0) || !std::isfinite(reading.value)) {
      return fmt::format("the {} must be above zero, not {:.6g}", name, reading.value);
    }
    if (!(reading.error >= 0 && reading.error < 1)) {
      return fmt::format("the error of the {} must be a share from 0 to 1, not {:.6g}", name, reading.error);
    }
  }
  return {};
}

/// What no pair of coils can have.
void judge(CouplingFactor& answer) {
  if (!answer.problem.empty()) return;
  if (answer.k > 1)
    answer.problem = fmt::format("k comes out as {:.4g}, above 1; a reading is wrong", answer.k);
  if (answer.k > 0 && answer.error > 0.3 * answer.k) {
    answer.warnings.push_back(
        fmt::format("good to {:.0f} % only; take another method", 100 * answer.error / answer.k));
  }
}

}  // namespace

CouplingFactor open_short(const OpenShort& readings) {
  CouplingFactor answer{"open / short", bad_readings({{"open inductance", readings.open},
                                                      {"shorted inductance", readings.shorted}})};
  if (!answer.problem.empty()) return answer;
  const double ratio = readings.shorted.value / readings.open.value;
  if (ratio >= 1) {
    answer.problem = fmt::format(
        "the shorted inductance ({:.6g} H) is not below the open one ({:.6g} H): the coupling is "
        "lost in the errors of the readings, or they are swapped",
        readings.shorted.value, readings.open.value);
    return answer;
  }
  double square = 1 - ratio;
  // A shorted coil with resistance carries less current: L falls by k^2 Q^2/(1 + Q^2) instead of k^2.
  if (readings.second_quality > 0) square *= 1 + 1 / (readings.second_quality * readings.second_quality);
  answer.k = std::sqrt(square);
  const double slope = square / (1 - ratio) / (2 * answer.k);  // d k / d ratio
  answer.error = slope * ratio * combine({readings.open.error, readings.shorted.error});
  if (readings.second_quality <= 0) {
    answer.warnings.push_back(
        "the resistance of the shorted coil makes k too small by 1/(2 Q^2); state its quality");
  } else if (readings.second_quality < 3) {
    answer.warnings.push_back("the shorted coil's quality is low: measure at a higher frequency");
  }
  judge(answer);
  return answer;
}

CouplingFactor aiding_opposing(const AidingOpposing& readings) {
  CouplingFactor answer{"aiding / opposing", bad_readings({{"aiding inductance", readings.aiding},
                                                           {"opposing inductance", readings.opposing},
                                                           {"first inductance", readings.first},
                                                           {"second inductance", readings.second}})};
  if (!answer.problem.empty()) return answer;
  const double mutual = (readings.aiding.value - readings.opposing.value) / 4;
  const double mean = std::sqrt(readings.first.value * readings.second.value);
  if (mutual < 0) {
    answer.problem = "the aiding inductance is below the opposing one; swap them";
    return answer;
  }
  answer.k = mutual / mean;
  answer.error = combine({readings.aiding.value * readings.aiding.error / (4 * mean),
                          readings.opposing.value * readings.opposing.error / (4 * mean),
                          answer.k * readings.first.error / 2, answer.k * readings.second.error / 2});
  const Consistency check = check_inductances(readings);
  if (!check.consistent) answer.warnings.push_back(check.sentence);
  judge(answer);
  return answer;
}

CouplingFactor voltage_ratio(const VoltageRatio& readings) {
  CouplingFactor answer{"voltage ratio", bad_readings({{"first voltage", readings.first_voltage},
                                                       {"second voltage", readings.second_voltage},
                                                       {"first inductance", readings.first},
                                                       {"second inductance", readings.second}})};
  if (!answer.problem.empty()) return answer;
  answer.k = readings.second_voltage.value / readings.first_voltage.value *
             std::sqrt(readings.first.value / readings.second.value);
  answer.error = answer.k * combine({readings.first_voltage.error, readings.second_voltage.error,
                                     readings.first.error / 2, readings.second.error / 2});
  answer.warnings.push_back(
      "the probe's capacitance on the open coil raises its voltage by (f/f_probe)^2; measure well "
      "below that resonance");
  judge(answer);
  return answer;
}

CouplingFactor split_resonances(const SplitResonances& readings) {
  CouplingFactor answer{"split resonances", bad_readings({{"lower frequency", readings.low},
                                                          {"upper frequency", readings.high},
                                                          {"first resonance", readings.first_alone},
                                                          {"second resonance", readings.second_alone}})};
  if (!answer.problem.empty()) return answer;
  const double low = readings.low.value * readings.low.value;
  const double high = readings.high.value * readings.high.value;
  if (high <= low) {
    answer.problem = "the upper frequency must be above the lower one";
    return answer;
  }
  const double q = (high - low) / (high + low);
  const double r = std::pow(readings.first_alone.value / readings.second_alone.value, 2);
  const double square = (q * q * (1 + r) * (1 + r) - (1 - r) * (1 - r)) / (4 * r);
  if (!(square > 0)) {
    answer.problem = fmt::format(
        "the two frequencies are no farther apart than the tanks' own ({:.6g} and {:.6g} Hz): no "
        "coupling shows",
        readings.first_alone.value, readings.second_alone.value);
    return answer;
  }
  answer.k = std::sqrt(square);
  // dq/q-ish: q depends on the ratio x = high/low, with x dq/dx = 1 - q^2 for relative errors of f.
  const double by_q = q * (1 + r) * (1 + r) / (4 * r * answer.k);
  const double q_error = (1 - q * q) * combine({readings.low.error, readings.high.error});
  // k^2 = q^2 (1+r)^2/(4r) - (1-r)^2/(4r); r d/dr of (1+r)^2/(4r) and of (1-r)^2/(4r) is (r - 1/r)/4 for
  // both.
  const double by_r = (q * q - 1) * (r - 1 / r) / 4 / (2 * answer.k);
  const double r_error = 2 * combine({readings.first_alone.error, readings.second_alone.error});
  answer.error = combine({by_q * q_error, by_r * r_error});
  const double least = std::min(readings.first_quality, readings.second_quality);
  if (least > 0 && answer.k * least < 1) {
    answer.warnings.push_back(
        fmt::format("k times the lower quality is {:.2g}, below 1: losses hide the split, and k is "
                    "not to be trusted",
                    answer.k * least));
  } else if (least > 0 && answer.k * least < 5) {
    answer.warnings.push_back(
        "the split is only a few line widths: take the frequencies from a ring-down fit with two "
        "modes, not from peaks");
  }
  if (std::abs(r - 1) > answer.k) {
    answer.warnings.push_back("the tanks differ by more than the coupling: tune them closer");
  }
  judge(answer);
  return answer;
}

Consistency check_inductances(const AidingOpposing& readings) {
  Consistency check;
  const double series = readings.aiding.value + readings.opposing.value;
  const double alone = readings.first.value + readings.second.value;
  const double ratio = series / (2 * alone);
  check.miss = ratio - 1;
  check.error = ratio * combine({readings.aiding.value * readings.aiding.error / series,
                                 readings.opposing.value * readings.opposing.error / series,
                                 readings.first.value * readings.first.error / alone,
                                 readings.second.value * readings.second.error / alone});
  check.consistent = std::abs(check.miss) <= 2 * check.error;
  check.sentence = fmt::format(
      "aiding + opposing misses 2 (first + second) by {:+.2f} %, where the stated errors allow "
      "{:.2f} %: {}",
      100 * check.miss, 200 * check.error,
      check.consistent ? "consistent" : "one reading is worse than stated");
  return check;
}

Choice choose(const std::vector<CouplingFactor>& answers) {
  Choice choice;
  const CouplingFactor* best = nullptr;
  for (std::size_t i = 0; i < answers.size(); ++i) {
    if (!answers[i].problem.empty() || (best && best->error <= answers[i].error)) continue;
    best = &answers[i];
    choice.best = i;
  }
  if (!best) {
    choice.agree = false;
    choice.sentence = "none of the readings gives a coupling factor";
    return choice;
  }
  choice.sentence =
      fmt::format("{} is the best here: k = {:.4g} +- {:.2g}", best->method, best->k, best->error);
  for (const CouplingFactor& other : answers) {
    if (!other.problem.empty() || &other == best) continue;
    const double allowed = 2 * combine({best->error, other.error});
    if (std::abs(other.k - best->k) <= allowed) continue;
    choice.agree = false;
    choice.sentence +=
        fmt::format("; {} ({:.4g}) differs by {:.2g}, more than the {:.2g} that the errors allow",
                    other.method, other.k, other.k - best->k, allowed);
  }
  return choice;
}

std::vector<Plan> plan_methods(double k, double first, double second, double inductance_error,
                               double voltage_error, double frequency_error) {
  const auto inductance = [&](double value) { return Reading{value, inductance_error}; };
  const auto voltage = [&](double value) { return Reading{value, voltage_error}; };
  const auto frequency = [&](double value) { return Reading{value, frequency_error}; };
  const double mutual = k * std::sqrt(first * second);
  const std::vector<CouplingFactor> answers{
      open_short({inductance(first), inductance(first * (1 - k * k)), 100}),
      aiding_opposing({inductance(first + second + 2 * mutual), inductance(first + second - 2 * mutual),
                       inductance(first), inductance(second)}),
      voltage_ratio({voltage(1), voltage(mutual / first), inductance(first), inductance(second)}),
      split_resonances(
          {frequency(1 / std::sqrt(1 + k)), frequency(1 / std::sqrt(1 - k)), frequency(1), frequency(1)})};
  std::vector<Plan> plans;
  for (const CouplingFactor& answer : answers) plans.push_back({answer.method, answer.error / answer.k});
  std::stable_sort(plans.begin(), plans.end(),
                   [](const Plan& a, const Plan& b) { return a.relative_error < b.relative_error; });
  return plans;
}

}  // namespace couplet::capture
