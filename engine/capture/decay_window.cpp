// SPDX-License-Identifier: MIT
#include "engine/capture/decay_window.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <limits>
#include <numbers>

namespace couplet::capture {
namespace {

using std::numbers::pi;

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

/// The largest distances from `offset` in each of some fifty pieces, but for the largest eighth: an envelope
/// that spikes do not move.
struct Envelope {
  std::vector<double> time, height;
};

Envelope envelope_of(const Samples& samples, double offset) {
  const std::size_t n = samples.time.size();
  const std::size_t piece = std::max<std::size_t>(8, n / 50);
  Envelope envelope;
  for (std::size_t begin = 0; begin < n; begin += piece) {
    std::vector<double> height;
    for (std::size_t i = begin; i < std::min(begin + piece, n); ++i) {
      height.push_back(std::abs(samples.value[i] - offset));
    }
    const auto at = height.begin() + static_cast<std::ptrdiff_t>(std::min(piece / 8, height.size() - 1));
    std::nth_element(height.begin(), at, height.end(), std::greater<>());
    envelope.time.push_back(samples.time[begin]);
    envelope.height.push_back(*at);
  }
  return envelope;
}

struct Window {
  double begin, end;
};

/// Stretches that may lie inside the decay: each begins in another place between where the envelope first and
/// last stands near its peak (a driven plateau may come before the decay), and runs to the end, or to where
/// the envelope jumps up again. The two earliest and the two latest come first.
std::vector<Window> core_windows(const Fitter& fitter) {
  const RingDownOptions& options = fitter.options;
  const Samples samples = part(fitter.all, options.start.value_or(fitter.all.time.front()),
                               options.end.value_or(fitter.all.time.back()));
  if (samples.used() < 4 * options.modes + 6) throw NoRingDown{"too few usable samples in the window"};
  double end = samples.time.back();
  const Envelope envelope = envelope_of(samples, median(samples.value));
  const double peak = *std::max_element(envelope.height.begin(), envelope.height.end());
  std::vector<std::size_t> near;
  for (std::size_t i = 0; i < envelope.height.size(); ++i) {
    if (envelope.height[i] >= 0.75 * peak) near.push_back(i);
  }
  for (std::size_t i = near.back() + 1; !options.end && i < envelope.height.size(); ++i) {
    const double before = std::max(envelope.height[i - 1], envelope.height[i < 2 ? 0 : i - 2]);
    if (envelope.height[i] < 0.2 * peak || envelope.height[i] < 5 * before) continue;
    end = envelope.time[i - 1];
    fitter.result.notes.push_back(fmt::format("excited again at {:.6g} s; fitted up to there", end));
    break;
  }
  if (options.start) return {{samples.time.front(), end}};
  std::vector<Window> windows;
  for (const std::size_t k : {0, 4, 1, 2, 3}) {
    // The piece in which the decay starts may be quiet in part: try the one behind it as well.
    const std::size_t place = near[k * (near.size() - 1) / 4];
    for (const std::size_t i : {place, place + 1}) {
      if (i < envelope.time.size()) windows.push_back({envelope.time[i], end});
    }
  }
  return windows;
}

DampedFit best_start(Samples& samples, std::size_t modes, double step) {
  const auto lines = spectral_start(samples, modes);
  if (lines.size() < modes) throw NoRingDown{"the spectrum holds fewer lines than modes were asked for"};
  Samples trial = samples;
  DampedFit fit = robust_fit(trial, lines, 0, step);
  if (modes == 1) {
    samples = trial;
    return fit;
  }
  // Modes hidden under a stronger one show in what that one leaves.
  Samples second = samples;
  std::vector<DampedMode> chain;
  for (std::size_t m = 0; m < modes; ++m) {
    Samples rest = second;
    if (m > 0) {
      const DampedFit partial = fit_damped(second, chain, 0);
      chain = partial.modes;
      for (std::size_t i = 0; i < rest.value.size(); ++i) rest.value[i] -= partial(rest.time[i]);
    }
    const auto next = spectral_start(rest, 1);
    if (next.empty()) break;
    chain.push_back(next.front());
  }
  DampedFit other = robust_fit(second, chain, 0, step);
  if (other.sum_of_squares / other.freedom < fit.sum_of_squares / fit.freedom) {
    samples = second;
    return other;
  }
  samples = trial;
  return fit;
}

/// The longest of the windows in which the fit leaves little more than in the best, and calls few samples
/// outliers.
const Decay& longest_good(const std::vector<Decay>& trials, double step) {
  const auto refused = [](const Decay& trial) {
    return 1 - static_cast<double>(trial.samples.used()) / static_cast<double>(trial.samples.time.size());
  };
  double least = std::numeric_limits<double>::infinity();
  double fewest = 1;
  for (const Decay& trial : trials) {
    least = std::min(least, trial.fit.noise);
    fewest = std::min(fewest, refused(trial));
  }
  const auto good = [&](const Decay& trial) {
    return trial.fit.noise <= std::max(1.3 * least, 0.35 * step) && refused(trial) <= fewest + 0.02;
  };
  return *std::max_element(trials.begin(), trials.end(), [&](const Decay& a, const Decay& b) {
    return good(a) != good(b) ? good(b) : a.fit.span < b.fit.span;
  });
}

Decay core_fit(const Fitter& fitter) {
  std::vector<Decay> trials;
  std::vector<double> tried;
  std::string why = "too few usable samples in the window";
  for (const Window& window : core_windows(fitter)) {
    if (std::find(tried.begin(), tried.end(), window.begin) != tried.end()) continue;
    // Where an early window does as well as the late ones there is no plateau to step over.
    if (tried.size() == 4 && trials.size() > 1) {
      const Decay& best = longest_good(trials, fitter.step);
      if (best.samples.time.front() <= tried[1]) break;
    }
    tried.push_back(window.begin);
    Decay trial{part(fitter.all, window.begin, window.end), {}};
    if (trial.samples.used() < 4 * fitter.options.modes + 6) continue;
    try {
      trial.fit = best_start(trial.samples, fitter.options.modes, fitter.step);
    } catch (const NoRingDown& no) {
      why = no.reason;
      continue;
    }
    // A window of less than two cycles fits anything.
    if (trial.fit.span * trial.fit.modes.front().omega < 4 * pi) {
      why = "fewer than two cycles in the window";
      continue;
    }
    trials.push_back(std::move(trial));
  }
  if (trials.empty()) throw NoRingDown{why};
  return longest_good(trials, fitter.step);
}

double floor_of_noise(const DampedFit& fit, double step) { return std::max(fit.noise, 0.2887 * step); }

/// Earliest instant from which on the fit, continued backwards, still describes every half cycle.
double extend_back(const Samples& all, const DampedFit& fit, double begin, double step) {
  const double half_cycle = pi / fit.modes.front().omega;
  const double noise = floor_of_noise(fit, step);
  double start = begin;
  std::size_t i = 0;
  while (i < all.time.size() && all.time[i] < begin) ++i;
  while (i > 0) {
    std::vector<double> off;
    std::size_t count = 0;
    double from = start;
    while (i > 0 && (count < 3 || start - all.time[i - 1] <= half_cycle)) {
      --i;
      ++count;
      from = all.time[i];
      if (all.weight[i] > 0) off.push_back(std::abs(all.value[i] - fit(all.time[i])));
    }
    // The median of noise is 0.67 sigma; spikes do not move it. Part of a half cycle that does not fit may
    // lie before the start: keep clear of it.
    if (!off.empty() && median(off) > (off.size() < 8 ? 3 : 1.7) * noise) return start + half_cycle / 2;
    start = from;
  }
  return start;
}

/// Quantised without noise to blur it, a decayed signal sticks to one level: such samples say nothing and
/// bias the damping. The window ends where the envelope falls to two levels.
double end_of_levels(const DampedFit& fit, double step, double end) {
  if (step <= 0 || fit.noise > 0.5 * step) return end;
  double last = fit.origin;
  for (const DampedMode& mode : fit.modes) {
    if (mode.alpha <= 0) return end;
    const double ratio = mode.amplitude() / (2 * step);
    if (ratio > 1) last = std::max(last, fit.origin + std::log(ratio) / mode.alpha);
  }
  return std::min(end, last);
}

/// The modes of `fit`, with amplitudes as they are at `origin`.
std::vector<DampedMode> moved(const DampedFit& fit, double origin) {
  std::vector<DampedMode> modes = fit.modes;
  for (DampedMode& mode : modes) {
    const double shift = origin - fit.origin;
    const double grow = std::exp(-mode.alpha * shift);
    const double c = std::cos(mode.omega * shift);
    const double s = std::sin(mode.omega * shift);
    const double a = mode.cosine;
    mode.cosine = grow * (a * c + mode.sine * s);
    mode.sine = grow * (mode.sine * c - a * s);
  }
  return modes;
}

}  // namespace

Samples part(const Samples& all, double begin, double end) {
  Samples samples;
  for (std::size_t i = 0; i < all.time.size(); ++i) {
    if (all.time[i] < begin || all.time[i] > end) continue;
    samples.time.push_back(all.time[i]);
    samples.value.push_back(all.value[i]);
    samples.weight.push_back(all.weight[i]);
  }
  // A window must begin and end with samples that count.
  while (!samples.weight.empty() && samples.weight.back() == 0) {
    samples.time.pop_back(), samples.value.pop_back(), samples.weight.pop_back();
  }
  const auto first =
      std::find_if(samples.weight.begin(), samples.weight.end(), [](double w) { return w > 0; });
  const auto skip = first - samples.weight.begin();
  samples.time.erase(samples.time.begin(), samples.time.begin() + skip);
  samples.value.erase(samples.value.begin(), samples.value.begin() + skip);
  samples.weight.erase(samples.weight.begin(), samples.weight.begin() + skip);
  return samples;
}

// Few samples have a median deviation that is itself unsure: the limit is wider for them.
DampedFit robust_fit(Samples& samples, const std::vector<DampedMode>& start, std::size_t degree,
                     double step) {
  DampedFit fit = fit_damped(samples, start, degree);
  const std::vector<double> whole = samples.weight;
  for (int lap = 0; lap < 12; ++lap) {
    std::vector<double> size;
    for (std::size_t i = 0; i < samples.time.size(); ++i) {
      if (whole[i] > 0) size.push_back(std::abs(samples.value[i] - fit(samples.time[i])));
    }
    const double freedom =
        std::max(1.0, static_cast<double>(size.size()) - static_cast<double>(4 * start.size() + 1));
    const double deviation = std::max(1.4826 * median(size), 0.2887 * step) * std::sqrt(1 + 8 / freedom);
    // The first laps bend the fit back from the outliers (Huber's weights), the later ones judge them.
    const bool judging = lap >= 4;
    std::vector<double> weight = whole;
    bool changed = false;
    for (std::size_t i = 0; i < weight.size(); ++i) {
      const double off = std::abs(samples.value[i] - fit(samples.time[i]));
      if (whole[i] > 0 && off > 6 * deviation) weight[i] = judging ? 0 : 2 * deviation / off;
      changed = changed || weight[i] != samples.weight[i];
    }
    if (!changed && lap == 0) break;
    if (!changed && judging) break;
    samples.weight = weight;
    if (samples.used() < 4 * start.size() + 3)
      throw NoRingDown{"most samples are outliers of every damped sinusoid"};
    fit = fit_damped(samples, fit.modes, degree);
  }
  return fit;
}

Decay find_decay(const Fitter& fitter) {
  const RingDownOptions& options = fitter.options;
  Decay decay = core_fit(fitter);
  const double end = decay.samples.time.back();
  for (int lap = 0; lap < 4; ++lap) {
    const double begin = decay.samples.time.front();
    const double earlier = options.start ? begin : extend_back(fitter.all, decay.fit, begin, fitter.step);
    const double last = options.end ? end : end_of_levels(decay.fit, fitter.step, end);
    Samples wider = part(fitter.all, earlier, last);
    if (wider.used() < 4 * options.modes + 6) break;
    if (wider.time.front() == begin && wider.time.back() == decay.samples.time.back()) break;
    const std::vector<DampedMode> start = moved(decay.fit, wider.time.front());
    decay.samples = wider;
    decay.fit = robust_fit(decay.samples, start, 0, fitter.step);
  }
  return decay;
}

}  // namespace couplet::capture
