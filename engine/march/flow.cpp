// SPDX-License-Identifier: MIT
#include "engine/march/flow.h"

#include <chrono>
#include <cmath>

namespace couplet {
namespace {

double now() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

/// C = A B, all n x n with one stride.
void multiply(const Buffer& A, const Buffer& B, Buffer& C, int n, int stride) {
  for (int c = 0; c < n; ++c) product(A.data(), stride, n, B.data() + static_cast<long>(c) * stride, C.data() + static_cast<long>(c) * stride);
}

}  // namespace

Flow::Flow(const Circuit& circuit, const Topology& topology, int fineness)
    : topology_(topology),
      n_(circuit.size()),
      stride_(padded(n_)),
      watches_(static_cast<int>(topology.watches.size())),
      watch_stride_(padded(std::max(watches_, 1))),
      rungs_(top + 1) {
  A_.assign(static_cast<std::size_t>(stride_) * n_, 0);
  for (int c = 0; c < n_; ++c) {
    for (int r = 0; r < n_; ++r) A_[c * stride_ + r] = topology.A(r, c);
  }
  // Rates: the energy coordinates' block, and each input's own (a sine's frequency).
  double rate = 0;
  for (int c = 0; c < circuit.states(); ++c) rate = std::max(rate, topology.A.col(c).head(circuit.states()).cwiseAbs().sum());
  for (std::size_t w = 0; w < circuit.sheet().waveforms.size(); ++w) {
    if (!circuit.sheet().waveforms[w].points.empty()) continue;
    rate = std::max(rate, 2 * M_PI * circuit.sheet().waveforms[w].frequency);
  }
  finest_ = rate > 0 ? std::ldexp(1.0, -fineness - 1 - std::ilogb(rate)) : std::ldexp(1.0, -top);

  const int block = watch_stride_;
  guard_rows_.assign(static_cast<std::size_t>(3 * block) * n_, 0);
  row_sizes_.assign(static_cast<std::size_t>(std::max(watches_, 1)) * n_, 0);
  slope_sizes_ = row_sizes_;
  if (watches_ > 0) {
    const Eigen::MatrixXd slopes = topology.watch_rows * topology.A, curvatures = slopes * topology.A;
    for (int c = 0; c < n_; ++c) {
      for (int r = 0; r < watches_; ++r) {
        guard_rows_[c * 3 * block + r] = topology.watch_rows(r, c);
        guard_rows_[c * 3 * block + block + r] = slopes(r, c);
        guard_rows_[c * 3 * block + 2 * block + r] = curvatures(r, c);
        row_sizes_[r * n_ + c] = std::abs(topology.watch_rows(r, c));
        slope_sizes_[r * n_ + c] = std::abs(slopes(r, c));
      }
    }
  }
}

int Flow::rung_below(double h) const {
  if (!(h >= finest_)) return -1;
  const double ratio = h / finest_;
  return ratio >= std::ldexp(1.0, top) ? top : std::ilogb(ratio);
}

void Flow::build(int rung) const {
  const double start = now();
  const std::size_t count = static_cast<std::size_t>(stride_) * n_;
  if (rungs_[0].empty()) {
    // E = sum (A h)^j / j!, j = 1..order, by Horner: E = X (I + X/2 (I + X/3 (...)))
    Buffer X(count), sum(count, 0.0), next(count);
    for (std::size_t i = 0; i < count; ++i) X[i] = A_[i] * finest_;
    sum = X;
    for (std::size_t i = 0; i < count; ++i) sum[i] /= order;
    for (int j = order - 1; j >= 1; --j) {
      // sum <- (X + X sum) / j
      multiply(X, sum, next, n_, stride_);
      for (std::size_t i = 0; i < count; ++i) sum[i] = (X[i] + next[i]) / j;
    }
    rungs_[0] = std::move(sum);
  }
  int built = rung;
  while (rungs_[built].empty()) --built;
  for (int k = built + 1; k <= rung; ++k) {
    Buffer next(count);
    multiply(rungs_[k - 1], rungs_[k - 1], next, n_, stride_);
    for (std::size_t i = 0; i < count; ++i) next[i] += 2 * rungs_[k - 1][i];
    rungs_[k] = std::move(next);
  }
  seconds_ += now() - start;
}

void Flow::step(int rung, const double* x, double* y) const {
  if (rungs_[rung].empty()) build(rung);
  sum_product(rungs_[rung].data(), stride_, n_, x, x, y);
}

void Flow::guards(const double* x, double* out) const { product(guard_rows_.data(), 3 * watch_stride_, n_, x, out); }

void Flow::series(const double* x, double* terms) const {
  std::copy(x, x + stride_, terms);
  for (int j = 1; j <= order; ++j) {
    double* term = terms + static_cast<long>(j) * stride_;
    product(A_.data(), stride_, n_, term - stride_, term);
    for (int i = 0; i < stride_; ++i) term[i] /= j;
  }
}

double Flow::watch_value(int watch, const double* x) const {
  double sum = 0;
  for (int i = 0; i < n_; ++i) sum += guard_rows_[static_cast<long>(i) * 3 * watch_stride_ + watch] * x[i];
  return sum;
}

double Flow::watch_scale(int watch, const double* x) const {
  double sum = 0;
  for (int i = 0; i < n_; ++i) sum += row_sizes_[static_cast<long>(watch) * n_ + i] * std::abs(x[i]);
  return sum;
}

double Flow::slope_scale(int watch, const double* x) const {
  double sum = 0;
  for (int i = 0; i < n_; ++i) sum += slope_sizes_[static_cast<long>(watch) * n_ + i] * std::abs(x[i]);
  return sum;
}

Eigen::MatrixXd Flow::integrate_squares(const std::vector<Buffer>& squares) const {
  using Map = Eigen::Map<const Eigen::MatrixXd, Eigen::Aligned64, Eigen::OuterStride<>>;
  const auto view = [&](const Buffer& b) { return Map(b.data(), n_, n_, Eigen::OuterStride<>(stride_)); };
  // From the top: a step on rung k is two on rung k-1, the second one starting from exp(A h_{k-1}) x.
  Eigen::MatrixXd carried = Eigen::MatrixXd::Zero(n_, n_);
  bool any = false;
  for (int k = static_cast<int>(squares.size()) - 1; k >= 0; --k) {
    if (any) {
      if (rungs_[k].empty()) build(k);
      const Eigen::MatrixXd half = carried + view(rungs_[k]) * carried;
      const Eigen::MatrixXd second = half + half * view(rungs_[k]).transpose();
      carried += second;
    }
    if (!squares[k].empty()) carried += view(squares[k]), any = true;
  }
  if (!any) return carried;
  Eigen::MatrixXd term = carried * finest_, sum = term;
  for (int j = 2; j <= order; ++j) {
    const Eigen::MatrixXd grown = topology_.A * term;
    term = (grown + grown.transpose()) * (finest_ / j);
    sum += term;
  }
  return sum;
}

}  // namespace couplet
