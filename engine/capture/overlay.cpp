// SPDX-License-Identifier: MIT
#include "engine/capture/overlay.h"

#include <fmt/format.h>

#include <Eigen/Dense>
#include <algorithm>
#include <boost/math/tools/minima.hpp>
#include <cmath>
#include <complex>
#include <functional>
#include <limits>
#include <numbers>
#include <unsupported/Eigen/FFT>
#include <utility>

namespace couplet::capture {
namespace {

using std::numbers::pi;

Waveform finite(const Waveform& raw) {
  Waveform kept;
  for (std::size_t i = 0; i < std::min(raw.time.size(), raw.value.size()); ++i) {
    if (!std::isfinite(raw.time[i]) || !std::isfinite(raw.value[i])) continue;
    kept.time.push_back(raw.time[i]);
    kept.value.push_back(raw.value[i]);
  }
  return kept;
}

std::string problem_of(const Waveform& wave, const char* name) {
  if (wave.time.size() < 8) return fmt::format("the {} waveform has fewer than 8 samples", name);
  if (std::adjacent_find(wave.time.begin(), wave.time.end(), std::greater_equal<>()) != wave.time.end()) {
    return fmt::format("the times of the {} waveform do not increase", name);
  }
  const auto [low, high] = std::minmax_element(wave.value.begin(), wave.value.end());
  if (!(*high > *low)) return fmt::format("the {} waveform is flat", name);
  return {};
}

double mean_step(const Waveform& wave) {
  return (wave.time.back() - wave.time.front()) / static_cast<double>(wave.time.size() - 1);
}

/// Straight lines between samples; instants must be asked for in order.
class Reader {
 public:
  explicit Reader(const Waveform& wave) : wave_(wave) {}
  double operator()(double t) {
    while (at_ + 2 < wave_.time.size() && wave_.time[at_ + 1] < t) ++at_;
    const double part = (t - wave_.time[at_]) / (wave_.time[at_ + 1] - wave_.time[at_]);
    return wave_.value[at_] + std::clamp(part, 0.0, 1.0) * (wave_.value[at_ + 1] - wave_.value[at_]);
  }

 private:
  const Waveform& wave_;
  std::size_t at_ = 0;
};

/// Measured and computed values at the measured instants inside the overlap.
struct Pairs {
  std::vector<double> time, measured, computed;  // time of the computed waveform
};

Pairs pair_up(const Waveform& measured, const Waveform& computed, double shift) {
  Pairs pairs;
  Reader reader(computed);
  for (std::size_t i = 0; i < measured.time.size(); ++i) {
    const double t = measured.time[i] + shift;
    if (t < computed.time.front() || t > computed.time.back()) continue;
    pairs.time.push_back(t);
    pairs.measured.push_back(measured.value[i]);
    pairs.computed.push_back(reader(t));
  }
  return pairs;
}

double mean(const std::vector<double>& values) {
  double sum = 0;
  for (const double v : values) sum += v;
  return sum / static_cast<double>(values.size());
}

double mean_difference(const Pairs& pairs) { return mean(pairs.measured) - mean(pairs.computed); }

double mean_square(const Pairs& pairs, double offset) {
  double sum = 0;
  for (std::size_t i = 0; i < pairs.time.size(); ++i) {
    const double off = pairs.measured[i] - offset - pairs.computed[i];
    sum += off * off;
  }
  return sum / static_cast<double>(pairs.time.size());
}

std::vector<double> on_grid(const Waveform& wave, double step, std::size_t length, double level) {
  Reader reader(wave);
  std::vector<double> values(length, 0.0);
  for (std::size_t i = 0; i < length; ++i) {
    const double t = wave.time.front() + step * static_cast<double>(i);
    if (t > wave.time.back()) break;
    values[i] = reader(t) - level;
  }
  return values;
}

/// 1 - r^2 with the correlation r of both waveforms about their means; 1 where they go against each other.
/// Blind to gain and offset, so that a wrong amplitude does not pull the shift to another cycle.
double mismatch(double n, double sum_m, double sum_c, double square_m, double square_c, double product) {
  const double cross = product - sum_m * sum_c / n;
  const double size = (square_m - sum_m * sum_m / n) * (square_c - sum_c * sum_c / n);
  if (cross <= 0 || size <= 0) return 1;
  return std::max(0.0, 1 - cross * cross / size);
}

/// Running sums of the values and their squares.
struct Sums {
  explicit Sums(const std::vector<double>& values, std::size_t n) : sum(n + 1, 0.0), square(n + 1, 0.0) {
    for (std::size_t i = 0; i < n; ++i) {
      sum[i + 1] = sum[i] + values[i];
      square[i + 1] = square[i] + values[i] * values[i];
    }
  }
  std::vector<double> sum, square;
};

struct Coarse {
  std::vector<double> shift, mismatch;  // in order of shift
};

/// The mismatch for every whole shift on a common grid; the products by correlation with an FFT.
Coarse coarse_search(const Waveform& measured, const Waveform& computed) {
  const double span_m = measured.time.back() - measured.time.front();
  const double span_c = computed.time.back() - computed.time.front();
  constexpr double most = 1 << 20;
  const double step = std::max(std::min(mean_step(measured), mean_step(computed)), (span_m + span_c) / most);
  const auto n_m = static_cast<std::size_t>(span_m / step) + 1;
  const auto n_c = static_cast<std::size_t>(span_c / step) + 1;
  std::size_t size = 1;
  while (size < n_m + n_c) size *= 2;
  // Both about the computed mean: differences of large sums would lose digits.
  const double level = mean(computed.value);
  std::vector<double> m = on_grid(measured, step, size, level);
  std::vector<double> c = on_grid(computed, step, size, level);
  const Sums sums_m(m, n_m);
  const Sums sums_c(c, n_c);
  Eigen::FFT<double> transform;
  std::vector<std::complex<double>> a, b;
  transform.fwd(a, m);
  transform.fwd(b, c);
  for (std::size_t i = 0; i < a.size(); ++i) a[i] = std::conj(a[i]) * b[i];
  std::vector<double> product;
  transform.inv(product, a);

  Coarse coarse;
  const std::size_t least = std::max<std::size_t>(4, std::min(n_m, n_c) / 2);
  // k counts from the earliest position: measured sample i lies on computed sample i + k - (n_m - 1).
  for (std::size_t k = 0; k + 1 < n_m + n_c; ++k) {
    const std::size_t m_first = k < n_m - 1 ? n_m - 1 - k : 0;
    const std::size_t c_first = k < n_m - 1 ? 0 : k - (n_m - 1);
    const std::size_t n = std::min(n_m - m_first, n_c - c_first);
    if (n < least) continue;
    const auto over = [n](const std::vector<double>& running, std::size_t first) {
      return running[first + n] - running[first];
    };
    const std::size_t lag = (k + size - (n_m - 1)) % size;
    coarse.shift.push_back(computed.time.front() - measured.time.front() +
                           step * (static_cast<double>(k) - static_cast<double>(n_m - 1)));
    coarse.mismatch.push_back(mismatch(static_cast<double>(n), over(sums_m.sum, m_first),
                                       over(sums_c.sum, c_first), over(sums_m.square, m_first),
                                       over(sums_c.square, c_first), product[lag]));
  }
  return coarse;
}

double exact_mismatch(const Waveform& measured, const Waveform& computed, double shift) {
  const Pairs pairs = pair_up(measured, computed, shift);
  if (pairs.time.size() < 4) return 1;
  double sums[5] = {0, 0, 0, 0, 0};
  const double level = pairs.computed.front();
  for (std::size_t i = 0; i < pairs.time.size(); ++i) {
    const double m = pairs.measured[i] - level;
    const double c = pairs.computed[i] - level;
    sums[0] += m, sums[1] += c, sums[2] += m * m, sums[3] += c * c, sums[4] += m * c;
  }
  return mismatch(static_cast<double>(pairs.time.size()), sums[0], sums[1], sums[2], sums[3], sums[4]);
}

/// Local minima of the coarse mismatch, with the value at the crest of a parabola through three points.
std::vector<std::pair<std::size_t, double>> dips(const Coarse& coarse) {
  std::vector<std::pair<std::size_t, double>> found;
  for (std::size_t i = 1; i + 1 < coarse.shift.size(); ++i) {
    const double before = coarse.mismatch[i - 1];
    const double here = coarse.mismatch[i];
    const double behind = coarse.mismatch[i + 1];
    if (here > before || here >= behind) continue;
    const double bend = before - 2 * here + behind;
    const double lean = (behind - before) / 2;
    found.emplace_back(i, std::max(0.0, here - (bend > 0 ? lean * lean / (2 * bend) : 0)));
  }
  return found;
}

/// Best shift to a small part of a sample: the coarse minimum, refined by Brent's method.
double find_shift(const Waveform& measured, const Waveform& computed, Overlay& result) {
  const Coarse coarse = coarse_search(measured, computed);
  auto places = dips(coarse);
  if (places.empty()) return 0;
  double best = 1;
  for (const auto& place : places) best = std::min(best, place.second);
  // Places that fit as well, but for noise, are those of a periodic waveform.
  std::erase_if(places, [&](const auto& place) { return place.second > 1.05 * best + 1e-4; });
  const std::size_t place = std::min_element(places.begin(), places.end(), [&](const auto& a, const auto& b) {
                              return std::abs(coarse.shift[a.first]) < std::abs(coarse.shift[b.first]);
                            })->first;
  if (places.size() > 1) {
    result.notes.push_back(
        fmt::format("the waveforms fit in {} places (they are periodic); the shift nearest to zero was "
                    "taken",
                    places.size()));
  }
  // In steps from the place: the minimiser's tolerance is absolute near zero.
  const double step = coarse.shift[1] - coarse.shift[0];
  const auto value = [&](double steps) {
    return exact_mismatch(measured, computed, coarse.shift[place] + steps * step);
  };
  return coarse.shift[place] + step * boost::math::tools::brent_find_minima(value, -1.0, 1.0, 26).first;
}

/// Amplitude, frequency and phase of the strongest oscillation: a sinusoid and a constant in least squares,
/// the frequency from the spectrum's peak, refined by Gauss-Newton (the four-parameter fit of IEEE Std 1057).
struct Tone {
  double omega = 0;             // [rad/s]; 0: none found
  std::complex<double> phasor;  // a - i b of a cos + b sin, at mid-overlap
};

Tone strongest_tone(const std::vector<double>& time, const std::vector<double>& value, double omega) {
  const double middle = (time.front() + time.back()) / 2;
  const double span = time.back() - time.front();
  Eigen::Vector4d p = Eigen::Vector4d::Zero();  // a, b, c, correction of omega
  for (int lap = 0; lap < 8; ++lap) {
    Eigen::Matrix4d normal = Eigen::Matrix4d::Zero();
    Eigen::Vector4d right = Eigen::Vector4d::Zero();
    for (std::size_t i = 0; i < time.size(); ++i) {
      const double t = time[i] - middle;
      const double c = std::cos(omega * t);
      const double s = std::sin(omega * t);
      const Eigen::Vector4d row(c, s, 1, t / span * (p[1] * c - p[0] * s));
      normal += row * row.transpose();
      right += value[i] * row;
    }
    if (lap == 0) normal(3, 3) = 1;  // no amplitude is known yet
    p = normal.ldlt().solve(right);
    if (lap > 0) omega += p[3] / span;
  }
  return {omega, {p[0], -p[1]}};
}

double spectral_peak(const std::vector<double>& time, const std::vector<double>& value) {
  const Waveform wave{time, value};
  const std::size_t n = time.size();
  const double step = mean_step(wave);
  std::vector<double> grid = on_grid(wave, step, n, mean(value));
  std::size_t size = 1;
  while (size < 4 * n) size *= 2;
  for (std::size_t i = 0; i < n; ++i) {
    grid[i] *= 0.5 - 0.5 * std::cos(2 * pi * static_cast<double>(i) / static_cast<double>(n - 1));
  }
  grid.resize(size, 0.0);
  Eigen::FFT<double> transform;
  std::vector<std::complex<double>> bins;
  transform.fwd(bins, grid);
  std::size_t peak = 1;
  for (std::size_t i = size / n; i < size / 2; ++i) {
    if (std::norm(bins[i]) > std::norm(bins[peak])) peak = i;
  }
  return 2 * pi * static_cast<double>(peak) / (step * static_cast<double>(size));
}

void compare_tones(const Pairs& pairs, Overlay& result) {
  const Tone computed = strongest_tone(pairs.time, pairs.computed, spectral_peak(pairs.time, pairs.computed));
  const Tone measured = strongest_tone(pairs.time, pairs.measured, spectral_peak(pairs.time, pairs.measured));
  result.frequency = computed.omega / (2 * pi);
  result.frequency_ratio = measured.omega / computed.omega;
  result.amplitude_ratio = std::abs(measured.phasor) / std::abs(computed.phasor);
  result.phase = std::arg(measured.phasor / computed.phasor) * 180 / pi;
  const double cycles = (pairs.time.back() - pairs.time.front()) * result.frequency;
  if (cycles < 2)
    result.notes.push_back(fmt::format("only {:.2g} cycles overlap: frequency and phase are rough", cycles));
  if (std::abs(result.frequency_ratio - 1) > 0.2) {
    result.notes.push_back(
        "the strongest oscillations differ by more than a fifth in frequency: are these the same signal?");
  } else if (std::abs(result.frequency_ratio - 1) * cycles > 0.25) {
    result.notes.push_back(
        "the frequencies drift apart by more than a quarter of a cycle over the overlap; the rms of the "
        "difference says little, compare a shorter stretch");
  }
}

void measure_difference(const Pairs& pairs, Overlay& result) {
  result.rms = std::sqrt(mean_square(pairs, result.offset));
  const double level = mean(pairs.computed);
  double square = 0;
  for (std::size_t i = 0; i < pairs.time.size(); ++i) {
    square += (pairs.computed[i] - level) * (pairs.computed[i] - level);
    const double off = pairs.measured[i] - result.offset - pairs.computed[i];
    if (std::abs(off) <= std::abs(result.worst)) continue;
    result.worst = off;
    result.worst_at = pairs.time[i];
  }
  result.relative_rms = result.rms / std::sqrt(square / static_cast<double>(pairs.time.size()));
}

}  // namespace

Overlay overlay(const Waveform& measured_raw, const Waveform& computed_raw, const OverlayOptions& options) {
  Overlay result;
  const Waveform measured = finite(measured_raw);
  const Waveform computed = finite(computed_raw);
  result.reason = problem_of(measured, "measured");
  if (result.reason.empty()) result.reason = problem_of(computed, "computed");
  if (!result.reason.empty()) return result;
  result.shift = options.shift ? *options.shift : find_shift(measured, computed, result);
  const Pairs pairs = pair_up(measured, computed, result.shift);
  if (pairs.time.size() < 8) {
    result.reason = fmt::format("only {} measured samples lie within the computed waveform (shift {:.6g} s)",
                                pairs.time.size(), result.shift);
    return result;
  }
  result.samples = pairs.time.size();
  result.begin = pairs.time.front();
  result.end = pairs.time.back();
  if (options.offset) result.offset = mean_difference(pairs);
  measure_difference(pairs, result);
  compare_tones(pairs, result);
  if (result.relative_rms >= 1) {
    result.notes.push_back("the difference is as large as the computed waveform: nothing was recognised");
  }
  result.usable = true;
  return result;
}

}  // namespace couplet::capture
