// SPDX-License-Identifier: MIT
// What is wrong inside a channel although every cell was read: clipped ends, points computed by the
// oscilloscope, an unmarked change of unit, a probe that reads ten times too little.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <unsupported/Eigen/FFT>

#include "engine/capture/csv_stages.h"
#include "engine/capture/levels.h"

namespace couplet::capture {
namespace {

std::vector<double> finite(const std::vector<double>& values) {
  std::vector<double> kept;
  kept.reserve(values.size());
  std::copy_if(values.begin(), values.end(), std::back_inserter(kept),
               [](double v) { return std::isfinite(v); });
  return kept;
}

/// Smallest m > 1 so that differences of the given order vanish except once every m rows; 1: none.
std::size_t computed_pattern(const std::vector<double>& values, std::size_t order, double range) {
  std::vector<double> difference = values;
  for (std::size_t pass = 0; pass < order; ++pass) {
    for (std::size_t i = 0; i + 1 < difference.size(); ++i) difference[i] = difference[i + 1] - difference[i];
    difference.pop_back();
  }
  // Values are printed with finite digits: their differences vanish only to that.
  const double small = 2e-5 * range;
  for (std::size_t m = 2; m <= 50; ++m) {
    if (difference.size() < 8 * m) break;
    for (std::size_t phase = 0; phase < m; ++phase) {
      std::size_t vanish = 0;
      std::size_t others = 0;
      std::size_t knees = 0;
      std::size_t corners = 0;
      for (std::size_t i = 0; i < difference.size(); ++i) {
        const bool flat = std::abs(difference[i]) <= small;
        if (i % m == phase) {
          ++corners;
          knees += flat ? 0 : 1;
        } else {
          ++others;
          vanish += flat ? 1 : 0;
        }
      }
      if (100 * vanish >= 99 * others && 10 * knees >= 6 * corners) return m;
    }
  }
  return 1;
}

/// Points computed with a sin(x)/x kernel hold nothing above the old Nyquist frequency: the noise floor of
/// the averaged spectrum falls off a cliff at 1/m of the new one. (Welch's method: P. D. Welch, IEEE Trans.
/// Audio Electroacoustics 15, 1967.)
std::size_t spectral_cliff(const std::vector<double>& values) {
  constexpr std::size_t length = 256;
  if (values.size() < 2 * length) return 1;
  Eigen::FFT<double> transform;
  std::vector<double> power(length / 2, 0.0);
  for (std::size_t begin = 0; begin + length <= values.size(); begin += length / 2) {
    std::vector<double> piece(length);
    double mean = 0;
    for (std::size_t i = 0; i < length; ++i) mean += values[begin + i] / length;
    for (std::size_t i = 0; i < length; ++i) {
      // Blackman-Harris window: its side lobes, 92 dB down, do not fill the cliff.
      const double x = 2 * std::numbers::pi * static_cast<double>(i) / length;
      const double window =
          0.35875 - 0.48829 * std::cos(x) + 0.14128 * std::cos(2 * x) - 0.01168 * std::cos(3 * x);
      piece[i] = (values[begin + i] - mean) * window;
    }
    std::vector<std::complex<double>> spectrum;
    transform.fwd(spectrum, piece);
    for (std::size_t i = 0; i < power.size(); ++i) power[i] += std::norm(spectrum[i]);
  }
  const auto median = [&](double from, double to) {
    const auto first = static_cast<std::size_t>(from * length / 2);
    const auto last = std::max(first + 3, static_cast<std::size_t>(to * length / 2));
    std::vector<double> band(power.begin() + static_cast<std::ptrdiff_t>(first),
                             power.begin() + static_cast<std::ptrdiff_t>(std::min(last, power.size())));
    std::nth_element(band.begin(), band.begin() + static_cast<std::ptrdiff_t>(band.size() / 2), band.end());
    return band[band.size() / 2];
  };
  for (const std::size_t m : {2, 4, 5, 8, 10}) {
    const double edge = 1.0 / static_cast<double>(m);
    const double below = median(0.6 * edge, 0.9 * edge);
    const double inner = median(0.35 * edge, 0.6 * edge);
    const double above = median(std::min(1.15 * edge, 0.8), std::min(1.5 * edge, 0.98));
    // A cliff of 40 dB with a floor before it that is level to 20 dB.
    if (below > 1e4 * above && inner < 100 * below && above > 0) return m;
  }
  return 1;
}

/// Auto-scaled units written without saying so: the number jumps from just above 1 to just below 1000.
void refuse_unit_jump(const Channel& channel, const std::vector<std::size_t>& lines) {
  std::size_t jumps = 0;
  std::size_t large = 0;
  std::size_t place = 0;
  const double scale = std::max(std::abs(channel.low), std::abs(channel.high));
  for (std::size_t i = 1; i < channel.values.size(); ++i) {
    const double a = channel.values[i - 1];
    const double b = channel.values[i];
    if (!(std::abs(b - a) > 0.3 * scale)) continue;
    ++large;
    const double ratio = std::abs(a) > std::abs(b) ? a / b : b / a;
    if (ratio < 300 || ratio > 1000) continue;
    if (jumps == 0) place = lines[i];
    ++jumps;
  }
  if (jumps >= 2 && 10 * jumps >= 8 * large) {
    throw Refusal(
        place, fmt::format("{} jumps by a factor near 1000, {} times: its unit seems to change from row to "
                           "row without being written; export with a fixed scale",
                           channel.name, jumps));
  }
}

/// Two voltage channels of one shape, ten or a hundred times apart: one probe factor is wrong, or both are
/// right.
void suspect_probes(Capture& capture) {
  for (std::size_t a = 0; a < capture.channels.size(); ++a) {
    for (std::size_t b = a + 1; b < capture.channels.size(); ++b) {
      const Channel& one = capture.channels[a];
      const Channel& two = capture.channels[b];
      if (one.unit != "V" || two.unit != "V") continue;
      double aa = 0;
      double bb = 0;
      double ab = 0;
      for (std::size_t i = 0; i < one.values.size(); ++i) {
        if (!std::isfinite(one.values[i]) || !std::isfinite(two.values[i])) continue;
        aa += one.values[i] * one.values[i];
        bb += two.values[i] * two.values[i];
        ab += one.values[i] * two.values[i];
      }
      if (!(aa > 0) || !(bb > 0) || std::abs(ab) < 0.99 * std::sqrt(aa * bb)) continue;
      const double ratio = std::sqrt(std::max(aa / bb, bb / aa));
      for (const double factor : {10.0, 100.0}) {
        if (std::abs(ratio / factor - 1) > 0.05) continue;
        capture.notes.push_back(
            fmt::format("{} and {} have one shape, {} times apart: is a probe factor forgotten?", one.name,
                        two.name, factor));
      }
    }
  }
}

}  // namespace

void find_defects(Capture& capture, const std::vector<std::size_t>& lines) {
  for (Channel& channel : capture.channels) {
    const std::vector<double> values = finite(channel.values);
    if (values.size() < 2) throw Refusal(0, fmt::format("channel {} holds no values", channel.name));
    const auto [low, high] = std::minmax_element(values.begin(), values.end());
    channel.low = *low;
    channel.high = *high;
    refuse_unit_jump(channel, lines);
    const double range = channel.high - channel.low;
    const Levels levels = find_levels(values);
    channel.step = levels.step;
    channel.clipped_low = channel.clipped_low || levels.flat_low;
    channel.clipped_high = channel.clipped_high || levels.flat_high;
    for (const auto& [clipped, word, at] : {std::tuple{channel.clipped_low, "bottom", channel.low},
                                            std::tuple{channel.clipped_high, "top", channel.high}}) {
      if (!clipped) continue;
      capture.notes.push_back(fmt::format("{}: flat {} at {:.6g} {}, clipped (or truly flat)", channel.name,
                                          word, at, channel.unit));
    }
    if (!capture.uniform) continue;
    const std::size_t held = computed_pattern(values, 1, range);
    const std::size_t straight = held > 1 ? held : computed_pattern(values, 2, range);
    channel.interpolated = straight > 1 ? straight : spectral_cliff(values);
    if (channel.interpolated > 1) {
      capture.notes.push_back(
          fmt::format("{}: one row in {} is a sample, the others were {} by the oscilloscope", channel.name,
                      channel.interpolated, held > 1 ? "repeated" : "interpolated"));
    }
  }
  suspect_probes(capture);
}

}  // namespace couplet::capture
