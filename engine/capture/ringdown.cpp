// SPDX-License-Identifier: MIT
#include "engine/capture/ringdown.h"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <functional>
#include <iterator>
#include <limits>
#include <numbers>

#include "engine/capture/damped_fit.h"
#include "engine/capture/levels.h"

namespace couplet::capture {
namespace {

using std::numbers::pi;

/// The capture holds no ring-down, or not the one asked for.
struct NoRingDown {
  std::string reason;
};

struct Fitter {
  const RingDownOptions& options;
  RingDown& result;
  Samples all;          // the whole capture; weight 0: clipped or missing
  double step;          // distance of quantised levels; 0: none
  double sampling = 0;  // mean rate [Hz]
};

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

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

Samples load(const std::vector<double>& time, const std::vector<double>& value,
             const RingDownOptions& options, const Levels& levels, RingDown& result) {
  Samples all;
  for (std::size_t i = 0; i < std::min(time.size(), value.size()); ++i) {
    if (!std::isfinite(value[i]) || !std::isfinite(time[i])) continue;
    all.time.push_back(time[i]);
    all.value.push_back(value[i]);
    all.weight.push_back(1);
  }
  const double infinite = std::numeric_limits<double>::infinity();
  const double low = options.clip_low.value_or(levels.flat_low ? levels.low : -infinite);
  const double high = options.clip_high.value_or(levels.flat_high ? levels.high : infinite);
  // Neighbours of clipped samples go too: of those near the limit only the ones that noise pulled inwards are
  // left.
  for (std::size_t i = 0; i < all.value.size(); ++i) {
    if (all.value[i] > low && all.value[i] < high) continue;
    ++result.clipped;
    for (std::size_t j = i > 0 ? i - 1 : 0; j <= std::min(i + 1, all.value.size() - 1); ++j)
      all.weight[j] = 0;
  }
  if (result.clipped > 0) {
    result.notes.push_back(fmt::format("{} clipped samples and their neighbours left out", result.clipped));
  }
  return all;
}

Levels levels_of(const std::vector<double>& value) {
  std::vector<double> finite;
  std::copy_if(value.begin(), value.end(), std::back_inserter(finite),
               [](double v) { return std::isfinite(v); });
  return finite.size() < 2 ? Levels{} : find_levels(finite);
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

/// Fit, leave out what lies impossibly far off, fit again. Few samples have a median deviation that is itself
/// unsure.
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

struct Trial {
  Samples samples;
  DampedFit fit;
};

/// The longest of the windows in which the fit leaves little more than in the best, and calls few samples
/// outliers.
const Trial& longest_good(const std::vector<Trial>& trials, double step) {
  const auto refused = [](const Trial& trial) {
    return 1 - static_cast<double>(trial.samples.used()) / static_cast<double>(trial.samples.time.size());
  };
  double least = std::numeric_limits<double>::infinity();
  double fewest = 1;
  for (const Trial& trial : trials) {
    least = std::min(least, trial.fit.noise);
    fewest = std::min(fewest, refused(trial));
  }
  const auto good = [&](const Trial& trial) {
    return trial.fit.noise <= std::max(1.3 * least, 0.35 * step) && refused(trial) <= fewest + 0.02;
  };
  return *std::max_element(trials.begin(), trials.end(), [&](const Trial& a, const Trial& b) {
    return good(a) != good(b) ? good(b) : a.fit.span < b.fit.span;
  });
}

Trial core_fit(const Fitter& fitter) {
  std::vector<Trial> trials;
  std::vector<double> tried;
  std::string why = "too few usable samples in the window";
  for (const Window& window : core_windows(fitter)) {
    if (std::find(tried.begin(), tried.end(), window.begin) != tried.end()) continue;
    // Where an early window does as well as the late ones there is no plateau to step over.
    if (tried.size() == 4 && trials.size() > 1) {
      const Trial& best = longest_good(trials, fitter.step);
      if (best.samples.time.front() <= tried[1]) break;
    }
    tried.push_back(window.begin);
    Trial trial{part(fitter.all, window.begin, window.end), {}};
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

void require_cycles(const Fitter& fitter, const DampedFit& fit, double begin, double end) {
  for (const DampedMode& mode : fit.modes) {
    const double frequency = mode.omega / (2 * pi);
    if (fitter.sampling < 2.2 * frequency) {
      throw NoRingDown{fmt::format("fewer than 2.2 samples a cycle at {:.6g} Hz: sample faster", frequency)};
    }
    double visible = end - begin;
    const double noise = std::max(fit.noise, 1e-12 * mode.amplitude());
    if (mode.alpha > 0)
      visible = std::min(visible, std::max(0.0, std::log(mode.amplitude() / noise)) / mode.alpha);
    if (visible * frequency < 1.5) {
      throw NoRingDown{
          fmt::format("only {:.2g} cycles of {:.6g} Hz stand out of the noise; at least 1.5 are needed",
                      visible * frequency, frequency)};
    }
  }
}

/// A baseline that leans or bends is fitted where it explains far more than chance (F above 20).
DampedFit with_baseline(Samples& samples, DampedFit fit, double step, RingDown& result) {
  for (std::size_t degree = 1; degree <= 2; ++degree) {
    if (samples.used() < 40) break;
    Samples trial = samples;
    const DampedFit next = robust_fit(trial, fit.modes, degree, step);
    if (fit.sum_of_squares - next.sum_of_squares < 20 * next.noise * next.noise ||
        fit.freedom - next.freedom > 1.5) {
      break;
    }
    fit = next;
    samples = trial;
    if (degree == 1) result.notes.push_back("the baseline drifts; a polynomial was fitted along");
  }
  return fit;
}

void refuse_second_mode(const Fitter& fitter, const Samples& samples, const DampedFit& fit) {
  const Line line = residual_line(samples, fit);
  double strongest = 0;
  for (const DampedMode& mode : fit.modes) strongest = std::max(strongest, mode.amplitude());
  const double share = line.amplitude / strongest;
  if (!line.significant) return;
  const double levels = 0.5 * fitter.step / strongest;
  if (share < std::max(0.02, levels)) {
    if (share > levels) {
      fitter.result.notes.push_back(
          fmt::format("a further oscillation at {:.6g} Hz of {:.2g} % was left in the rest", line.frequency,
                      100 * share));
    }
    return;
  }
  throw NoRingDown{
      fmt::format("the rest holds an oscillation at {:.6g} Hz of {:.3g} % of the largest: either there are "
                  "more than {} modes (ask for them), or frequency and damping change with amplitude",
                  line.frequency, 100 * share, fitter.options.modes)};
}

/// Part of the samples' power, weighted by the envelope, that the fit explains.
double explained(const Samples& samples, const DampedFit& fit) {
  double rest = 0;
  double total = 0;
  for (std::size_t i = 0; i < samples.time.size(); ++i) {
    if (samples.weight[i] == 0) continue;
    const double t = samples.time[i] - fit.origin;
    double window = 0;
    for (const DampedMode& mode : fit.modes)
      window = std::max(window, std::exp(-2 * std::max(mode.alpha, 0.0) * t));
    const double off = samples.value[i] - fit(samples.time[i]);
    const double height = samples.value[i] - fit.baseline.front();
    rest += window * off * off;
    total += window * height * height;
  }
  return 1 - rest / total;
}

RingDownMode report(const DampedMode& mode, double quantile) {
  RingDownMode out;
  const double w = mode.omega;
  const double a = mode.alpha;
  const double natural = std::hypot(w, a);
  const auto around = [&](double value, double variance) {
    const double half = quantile * std::sqrt(std::max(variance, 0.0));
    return Estimate{value, value - half, value + half};
  };
  out.frequency = around(w / (2 * pi), mode.var_omega / (4 * pi * pi));
  out.damping = around(a, mode.var_alpha);
  const double var_natural =
      (w * w * mode.var_omega + a * a * mode.var_alpha + 2 * w * a * mode.cov_omega_alpha) /
      (natural * natural);
  out.natural = around(natural / (2 * pi), var_natural / (4 * pi * pi));
  // Quality falls as damping rises: its interval comes from the ends of the damping's.
  out.quality = {natural / (2 * a), std::hypot(w, out.damping.high) / (2 * out.damping.high),
                 std::hypot(w, out.damping.low) / (2 * out.damping.low)};
  out.amplitude = mode.amplitude();
  out.phase = std::atan2(-mode.sine, mode.cosine);
  out.var_omega = mode.var_omega;
  out.var_alpha = mode.var_alpha;
  out.cov_omega_alpha = mode.cov_omega_alpha;
  return out;
}

void judge_modes(const std::vector<RingDownMode>& modes, double noise) {
  for (const RingDownMode& mode : modes) {
    const double f = mode.frequency.value;
    if (!(mode.amplitude > 0) || !std::isfinite(mode.damping.high) || !std::isfinite(mode.frequency.high)) {
      throw NoRingDown{"the fit has no unique answer: more modes asked for than the capture holds"};
    }
    if (mode.damping.high < 0) {
      throw NoRingDown{fmt::format("the oscillation at {:.6g} Hz grows: this is a start, not a decay", f)};
    }
    if (mode.damping.low <= 0) {
      throw NoRingDown{
          fmt::format("no decay at {:.6g} Hz: the damping ({:.3g} 1/s, between {:.3g} and {:.3g}) cannot be "
                      "told from zero; a steady oscillation, too short a record, or too much noise",
                      f, mode.damping.value, mode.damping.low, mode.damping.high)};
    }
    if (mode.quality.value < 1.5) {
      throw NoRingDown{fmt::format("damped too strongly to ring: quality {:.3g}", mode.quality.value)};
    }
    if (mode.frequency.high - mode.frequency.low > 0.2 * f) {
      throw NoRingDown{
          fmt::format("the frequency near {:.6g} Hz is only known to {:.2g} %: noise {:.3g} hides the ring",
                      f, 50 * (mode.frequency.high - mode.frequency.low) / f, noise)};
    }
  }
  for (std::size_t i = 1; i < modes.size(); ++i) {
    if (modes[i].frequency.low < modes[i - 1].frequency.high) {
      throw NoRingDown{
          fmt::format("two modes near {:.6g} Hz cannot be told apart", modes[i].frequency.value)};
    }
  }
}

void run(Fitter& fitter) {
  RingDown& result = fitter.result;
  const RingDownOptions& options = fitter.options;
  if (fitter.all.used() < 4 * options.modes + 6) {
    throw NoRingDown{fmt::format("{} usable samples; {} modes need at least {}", fitter.all.used(),
                                 options.modes, 4 * options.modes + 6)};
  }
  const auto [low, high] = std::minmax_element(fitter.all.value.begin(), fitter.all.value.end());
  if (!(*high > *low)) throw NoRingDown{"the capture is flat"};
  auto [samples, fit] = core_fit(fitter);
  const double end = samples.time.back();
  for (int lap = 0; lap < 4; ++lap) {
    const double earlier = options.start ? samples.time.front()
                                         : extend_back(fitter.all, fit, samples.time.front(), fitter.step);
    const double last = options.end ? end : end_of_levels(fit, fitter.step, end);
    Samples wider = part(fitter.all, earlier, last);
    if (wider.used() < 4 * options.modes + 6) break;
    const bool same = wider.time.front() == samples.time.front() && wider.time.back() == samples.time.back();
    if (same) break;
    // Amplitudes are those at the old origin; carry them to the new one by starting from it.
    std::vector<DampedMode> start = fit.modes;
    for (DampedMode& mode : start) {
      const double shift = wider.time.front() - fit.origin;
      const double grow = std::exp(-mode.alpha * shift);
      const double c = std::cos(mode.omega * shift);
      const double s = std::sin(mode.omega * shift);
      const double a = mode.cosine;
      mode.cosine = grow * (a * c + mode.sine * s);
      mode.sine = grow * (mode.sine * c - a * s);
    }
    samples = wider;
    fit = robust_fit(samples, start, 0, fitter.step);
  }
  fit = with_baseline(samples, fit, fitter.step, result);
  require_cycles(fitter, fit, samples.time.front(), samples.time.back());
  const double share = explained(samples, fit);
  if (share < 0.5) {
    throw NoRingDown{fmt::format(
        "no damped sinusoid describes it: the best one, {:.6g} Hz, explains {:.0f} % of the power",
        fit.modes.front().omega / (2 * pi), 100 * std::max(0.0, share))};
  }
  colour_covariance(samples, fit);
  std::sort(fit.modes.begin(), fit.modes.end(),
            [](const auto& a, const auto& b) { return a.omega < b.omega; });
  result.quantile = boost::math::quantile(boost::math::students_t(std::max(1.0, fit.freedom)), 0.975);
  for (const DampedMode& mode : fit.modes) result.modes.push_back(report(mode, result.quantile));
  result.offset = fit.baseline.front();
  result.start = samples.time.front();
  result.end = samples.time.back();
  result.noise = fit.noise;
  result.used = samples.used();
  for (std::size_t i = 0; i < samples.time.size(); ++i) {
    const auto at = std::lower_bound(fitter.all.time.begin(), fitter.all.time.end(), samples.time[i]);
    if (samples.weight[i] == 0 &&
        fitter.all.weight[static_cast<std::size_t>(at - fitter.all.time.begin())] > 0) {
      ++result.outliers;
    }
  }
  if (fit.colour > 1) {
    result.notes.push_back(
        fmt::format("what the fit leaves is no white noise: {:.1f} times as strong near the ring, and "
                    "the intervals were widened for it",
                    std::sqrt(fit.colour)));
  }
  judge_modes(result.modes, fit.noise);
  refuse_second_mode(fitter, samples, fit);
}

}  // namespace

RingDown fit_ring_down(const std::vector<double>& time, const std::vector<double>& value,
                       const RingDownOptions& options) {
  RingDown result;
  const Levels levels = levels_of(value);
  Fitter fitter{options, result, load(time, value, options, levels, result),
                options.step.value_or(levels.step), 0};
  if (fitter.all.time.size() > 1) {
    fitter.sampling =
        static_cast<double>(fitter.all.time.size() - 1) / (fitter.all.time.back() - fitter.all.time.front());
  }
  try {
    run(fitter);
    result.usable = true;
    result.reason.clear();
  } catch (const NoRingDown& why) {
    result.reason = why.reason;
  }
  return result;
}

}  // namespace couplet::capture
