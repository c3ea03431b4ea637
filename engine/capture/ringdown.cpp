// SPDX-License-Identifier: MIT
#include "engine/capture/ringdown.h"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <iterator>
#include <limits>
#include <numbers>

#include "engine/capture/decay_window.h"
#include "engine/capture/levels.h"

namespace couplet::capture {
namespace {

using std::numbers::pi;

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

void report_fit(const Fitter& fitter, const Samples& samples, DampedFit& fit) {
  RingDown& result = fitter.result;
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
  auto [samples, fit] = find_decay(fitter);
  fit = with_baseline(samples, fit, fitter.step, result);
  require_cycles(fitter, fit, samples.time.front(), samples.time.back());
  const double share = explained(samples, fit);
  if (share < 0.5) {
    throw NoRingDown{fmt::format(
        "no damped sinusoid describes it: the best one, {:.6g} Hz, explains {:.0f} % of the power",
        fit.modes.front().omega / (2 * pi), 100 * std::max(0.0, share))};
  }
  colour_covariance(samples, fit);
  report_fit(fitter, samples, fit);
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
