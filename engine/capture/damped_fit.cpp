// SPDX-License-Identifier: MIT
#include "engine/capture/damped_fit.h"

#include <Eigen/Dense>
#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <complex>
#include <numbers>
#include <unsupported/Eigen/FFT>

namespace couplet::capture {
namespace {

using std::numbers::pi;

std::size_t power_of_two(std::size_t n) {
  std::size_t size = 1;
  while (size < n) size *= 2;
  return size;
}

/// Values on an even grid over the same span, straight lines between samples that take part.
std::vector<double> even(const Samples& samples, const std::vector<double>& value) {
  std::vector<std::size_t> kept;
  for (std::size_t i = 0; i < value.size(); ++i) {
    if (samples.weight[i] > 0) kept.push_back(i);
  }
  const std::size_t n = value.size();
  const double begin = samples.time.front();
  const double step = (samples.time.back() - begin) / static_cast<double>(n - 1);
  std::vector<double> grid(n);
  std::size_t right = 1;
  for (std::size_t i = 0; i < n; ++i) {
    const double t = begin + step * static_cast<double>(i);
    while (right + 1 < kept.size() && samples.time[kept[right]] < t) ++right;
    const std::size_t a = kept[right - 1];
    const std::size_t b = kept[right];
    const double part = (t - samples.time[a]) / (samples.time[b] - samples.time[a]);
    grid[i] = value[a] + std::clamp(part, 0.0, 1.0) * (value[b] - value[a]);
  }
  return grid;
}

/// Amplitude spectrum of `grid`, padded to at least twice its length; `padded` receives that length.
std::vector<double> spectrum_of(std::vector<double> grid, std::size_t& padded) {
  padded = power_of_two(2 * grid.size());
  grid.resize(padded, 0.0);
  std::vector<std::complex<double>> bins;
  Eigen::FFT<double> transform;
  transform.fwd(bins, grid);
  std::vector<double> magnitude(padded / 2);
  for (std::size_t i = 0; i < magnitude.size(); ++i) magnitude[i] = std::abs(bins[i]);
  return magnitude;
}

/// Best a, b, c for given omega and alpha, and the sum of squares left.
double linear_fit(const Samples& samples, DampedMode& mode) {
  Eigen::Matrix3d normal = Eigen::Matrix3d::Zero();
  Eigen::Vector3d right = Eigen::Vector3d::Zero();
  double total = 0;
  for (std::size_t i = 0; i < samples.time.size(); ++i) {
    if (samples.weight[i] == 0) continue;
    const double t = samples.time[i] - samples.time.front();
    const double decay = std::exp(-mode.alpha * t);
    const Eigen::Vector3d row(decay * std::cos(mode.omega * t), decay * std::sin(mode.omega * t), 1);
    normal += row * row.transpose();
    right += samples.value[i] * row;
    total += samples.value[i] * samples.value[i];
  }
  const Eigen::Vector3d best = normal.ldlt().solve(right);
  mode.cosine = best[0];
  mode.sine = best[1];
  return total - best.dot(right);
}

struct Scaled {
  const Samples* samples;
  double origin, span;
  std::size_t modes, degree;
  std::size_t size() const { return 4 * modes + degree + 1; }
};

/// Model and derivatives at one instant; parameters: omega T, alpha T, a, b of each mode, then the baseline.
double model(const Scaled& problem, const Eigen::VectorXd& p, double x, Eigen::VectorXd* row) {
  double sum = 0;
  for (std::size_t m = 0; m < problem.modes; ++m) {
    const auto k = static_cast<Eigen::Index>(4 * m);
    const double decay = std::exp(-p[k + 1] * x);
    const double c = decay * std::cos(p[k] * x);
    const double s = decay * std::sin(p[k] * x);
    const double part = p[k + 2] * c + p[k + 3] * s;
    sum += part;
    if (row) {
      (*row)[k] = x * (p[k + 3] * c - p[k + 2] * s);
      (*row)[k + 1] = -x * part;
      (*row)[k + 2] = c;
      (*row)[k + 3] = s;
    }
  }
  double power = 1;
  for (std::size_t d = 0; d <= problem.degree; ++d) {
    const auto k = static_cast<Eigen::Index>(4 * problem.modes + d);
    sum += p[k] * power;
    if (row) (*row)[k] = power;
    power *= x;
  }
  return sum;
}

double normal_equations(const Scaled& problem, const Eigen::VectorXd& p, Eigen::MatrixXd* normal,
                        Eigen::VectorXd* gradient) {
  Eigen::VectorXd row(p.size());
  if (normal) normal->setZero(p.size(), p.size());
  if (gradient) gradient->setZero(p.size());
  double sum = 0;
  const Samples& samples = *problem.samples;
  for (std::size_t i = 0; i < samples.time.size(); ++i) {
    const double weight = samples.weight[i];
    if (weight == 0) continue;
    const double x = (samples.time[i] - problem.origin) / problem.span;
    const double off = samples.value[i] - model(problem, p, x, normal ? &row : nullptr);
    sum += weight * off * off;
    if (!normal) continue;
    normal->selfadjointView<Eigen::Lower>().rankUpdate(row, weight);
    *gradient += weight * off * row;
  }
  if (normal) *normal = normal->selfadjointView<Eigen::Lower>();
  return sum;
}

/// Levenberg-Marquardt; returns the sum of squares and leaves the normal matrix at the minimum.
double minimise(const Scaled& problem, Eigen::VectorXd& p, Eigen::MatrixXd& normal, bool& converged) {
  Eigen::VectorXd gradient;
  double sum = normal_equations(problem, p, &normal, &gradient);
  double lambda = 1e-3;
  const auto samples = static_cast<double>(problem.samples->used());
  converged = false;
  for (int lap = 0; lap < 200; ++lap) {
    const Eigen::VectorXd scale = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
    Eigen::MatrixXd damped = scale.asDiagonal() * normal * scale.asDiagonal();
    damped.diagonal().array() += lambda;
    const Eigen::VectorXd step = scale.cwiseProduct(damped.ldlt().solve(scale.cwiseProduct(gradient)));
    const Eigen::VectorXd trial = p + step;
    const double trial_sum = normal_equations(problem, trial, nullptr, nullptr);
    if (std::isfinite(trial_sum) && trial_sum <= sum) {
      // A gain of a millionth of one sample's variance moves the parameters by a thousandth of their
      // deviation.
      const double gain = sum - trial_sum;
      p = trial;
      sum = normal_equations(problem, p, &normal, &gradient);
      lambda = std::max(lambda / 8, 1e-12);
      if (gain * samples <= 1e-6 * sum || sum == 0) {
        converged = true;
        break;
      }
    } else {
      lambda *= 6;
      if (lambda > 1e12) {
        converged = true;  // round-off: no step makes it better
        break;
      }
    }
  }
  return sum;
}

/// Noise power at the frequency of `mode`, as seen through its envelope, over that of white noise of the same
/// rms; 1 where the difference is not significant. `lines` receives how many spectral estimates were
/// averaged.
double noise_colour(const Samples& samples, const DampedFit& fit, const DampedMode& mode, double& lines) {
  const double span = samples.time.back() - samples.time.front();
  const double nyquist = pi * static_cast<double>(samples.time.size()) / span;
  const double spacing = std::max(2 * pi / span, 2 * mode.alpha);
  std::vector<double> frequencies;
  for (int j = 2; j < 14; ++j) {
    const double below = mode.omega - j * spacing;
    const double above = mode.omega + j * spacing;
    if (below > 0.3 * mode.omega) frequencies.push_back(below);
    if (above < std::min(0.95 * nyquist, 1.7 * mode.omega)) frequencies.push_back(above);
  }
  lines = static_cast<double>(frequencies.size());
  if (frequencies.size() < 6) return 1;
  std::vector<std::complex<double>> sums(frequencies.size());
  double norm = 0;
  for (std::size_t i = 0; i < samples.time.size(); ++i) {
    if (samples.weight[i] == 0) continue;
    const double t = samples.time[i] - samples.time.front();
    const double window = std::exp(-mode.alpha * t);
    const double off = window * (samples.value[i] - fit(samples.time[i]));
    norm += window * window;
    for (std::size_t j = 0; j < sums.size(); ++j) sums[j] += off * std::polar(1.0, -frequencies[j] * t);
  }
  double power = 0;
  for (const auto& sum : sums) power += std::norm(sum) / norm;
  const double ratio = power / lines / (fit.noise * fit.noise);
  const boost::math::chi_squared white(2 * lines);
  const double limit = boost::math::quantile(white, 0.995) / (2 * lines);
  return ratio > limit ? ratio : 1;
}

}  // namespace

std::size_t Samples::used() const {
  return static_cast<std::size_t>(
      std::count_if(weight.begin(), weight.end(), [](double w) { return w > 0; }));
}

double DampedFit::operator()(double t) const {
  double sum = 0;
  for (const DampedMode& mode : modes) {
    const double x = t - origin;
    sum += std::exp(-mode.alpha * x) *
           (mode.cosine * std::cos(mode.omega * x) + mode.sine * std::sin(mode.omega * x));
  }
  double power = 1;
  for (const double c : baseline) {
    sum += c * power;
    power *= (t - origin) / span;
  }
  return sum;
}

std::vector<DampedMode> spectral_start(const Samples& samples, std::size_t count) {
  std::vector<double> grid = even(samples, samples.value);
  double mean = 0;
  for (const double v : grid) mean += v / static_cast<double>(grid.size());
  for (double& v : grid) v -= mean;
  const double span = samples.time.back() - samples.time.front();
  const double step = span / static_cast<double>(grid.size() - 1);
  std::size_t padded = 0;
  std::vector<double> magnitude = spectrum_of(grid, padded);
  const double per_bin = 2 * pi / (step * static_cast<double>(padded));
  const std::size_t cycle = padded / grid.size();  // bins of one cycle in the record

  std::vector<DampedMode> modes;
  for (std::size_t i = 0; i < cycle / 2 + 1; ++i) magnitude[i] = 0;
  for (std::size_t found = 0; found < count; ++found) {
    const auto peak =
        static_cast<std::size_t>(std::max_element(magnitude.begin(), magnitude.end()) - magnitude.begin());
    if (magnitude[peak] == 0) break;
    DampedMode best;
    double best_sum = 0;
    for (double decay = 0.25; decay < 200; decay *= 2) {
      DampedMode trial;
      trial.omega = per_bin * static_cast<double>(peak);
      trial.alpha = decay / span;
      const double sum = linear_fit(samples, trial);
      if (best.omega == 0 || sum < best_sum) best = trial, best_sum = sum;
    }
    modes.push_back(best);
    // The next line is the highest local maximum outside this one.
    std::size_t low = peak;
    std::size_t high = peak;
    while (low > 0 && (peak - low < cycle || magnitude[low - 1] < magnitude[low])) --low;
    while (high + 1 < magnitude.size() && (high - peak < cycle || magnitude[high + 1] < magnitude[high]))
      ++high;
    std::fill(magnitude.begin() + static_cast<std::ptrdiff_t>(low),
              magnitude.begin() + static_cast<std::ptrdiff_t>(high) + 1, 0.0);
  }
  return modes;
}

DampedFit fit_damped(const Samples& samples, const std::vector<DampedMode>& start, std::size_t degree) {
  DampedFit fit;
  fit.origin = samples.time.front();
  fit.span = samples.time.back() - fit.origin;
  const Scaled problem{&samples, fit.origin, fit.span, start.size(), degree};
  Eigen::VectorXd p = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(problem.size()));
  for (std::size_t m = 0; m < start.size(); ++m) {
    const auto k = static_cast<Eigen::Index>(4 * m);
    p.segment<4>(k) << start[m].omega * fit.span, start[m].alpha * fit.span, start[m].cosine, start[m].sine;
  }
  double weights = 0;
  double mean = 0;
  for (std::size_t i = 0; i < samples.value.size(); ++i) {
    mean += samples.weight[i] * samples.value[i];
    weights += samples.weight[i];
  }
  p[static_cast<Eigen::Index>(4 * start.size())] = mean / weights;
  Eigen::MatrixXd normal;
  fit.sum_of_squares = minimise(problem, p, normal, fit.converged);
  fit.freedom = static_cast<double>(samples.used()) - static_cast<double>(problem.size());
  fit.noise = std::sqrt(fit.sum_of_squares / std::max(fit.freedom, 1.0));

  const Eigen::VectorXd scale = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
  const Eigen::MatrixXd scaled = scale.asDiagonal() * normal * scale.asDiagonal();
  const Eigen::MatrixXd inverse = scale.asDiagonal() *
                                  scaled.ldlt().solve(Eigen::MatrixXd::Identity(p.size(), p.size())) *
                                  scale.asDiagonal();
  for (std::size_t m = 0; m < start.size(); ++m) {
    const auto k = static_cast<Eigen::Index>(4 * m);
    DampedMode mode;
    const double sign = p[k] < 0 ? -1 : 1;
    mode.omega = sign * p[k] / fit.span;
    mode.alpha = p[k + 1] / fit.span;
    mode.cosine = p[k + 2];
    mode.sine = sign * p[k + 3];
    const double factor = fit.noise * fit.noise / (fit.span * fit.span);
    mode.var_omega = factor * inverse(k, k);
    mode.var_alpha = factor * inverse(k + 1, k + 1);
    mode.cov_omega_alpha = sign * factor * inverse(k, k + 1);
    fit.modes.push_back(mode);
  }
  fit.baseline.assign(p.data() + 4 * start.size(), p.data() + p.size());
  return fit;
}

void colour_covariance(const Samples& samples, DampedFit& fit) {
  for (DampedMode& mode : fit.modes) {
    double lines = 0;
    const double colour = noise_colour(samples, fit, mode, lines);
    if (colour <= 1) continue;
    fit.colour = std::max(fit.colour, colour);
    fit.freedom = std::min(fit.freedom, 2 * lines);
    mode.var_omega *= colour;
    mode.var_alpha *= colour;
    mode.cov_omega_alpha *= colour;
  }
}

Line residual_line(const Samples& samples, const DampedFit& fit) {
  std::vector<double> off(samples.time.size());
  for (std::size_t i = 0; i < off.size(); ++i) off[i] = samples.value[i] - fit(samples.time[i]);
  std::vector<double> grid = even(samples, off);
  const double step = fit.span / static_cast<double>(grid.size() - 1);
  double norm = 0;
  for (std::size_t i = 0; i < grid.size(); ++i) {
    const double window = std::exp(-fit.modes.front().alpha * step * static_cast<double>(i));
    grid[i] *= window;
    norm += window * window;
  }
  std::size_t padded = 0;
  const std::vector<double> magnitude = spectrum_of(grid, padded);
  const auto peak =
      static_cast<std::size_t>(std::max_element(magnitude.begin() + 1, magnitude.end()) - magnitude.begin());
  Line line;
  line.frequency = static_cast<double>(peak) / (step * static_cast<double>(padded));
  line.amplitude = 2 * magnitude[peak] / norm;
  // White noise: the largest of n/2 exponentially distributed powers (R. A. Fisher, Proc. R. Soc. A 125,
  // 1929).
  const double ratio = magnitude[peak] * magnitude[peak] / (norm * fit.noise * fit.noise);
  line.significant = ratio > std::log(static_cast<double>(grid.size()) / 2) + std::log(1e4);
  return line;
}

}  // namespace couplet::capture
