// SPDX-License-Identifier: MIT
#include "engine/figures/extremes.h"

#include <cmath>

namespace couplet {

Extremes::Extremes(const Quantities& quantities)
    : quantities_(quantities), count_(static_cast<int>(quantities.all().size())), stride_(padded(std::max(count_, 1))) {
  ranges_.resize(count_);
  first_.assign(2 * stride_, 0);
  last_ = first_;
  between_ = first_;
  state_.assign(padded(quantities.circuit().size()), 0);
}

void Extremes::clear() { ranges_.assign(count_, {}); }

const Buffer& Extremes::rows(const Topology& topology) {
  if (static_cast<int>(rows_.size()) <= topology.id) rows_.resize(topology.id + 1);
  Buffer& mine = rows_[topology.id];
  if (!mine.empty()) return mine;
  const int n = quantities_.circuit().size();
  const Eigen::MatrixXd values = quantities_.rows(topology), slopes = values * topology.A;
  mine.assign(static_cast<std::size_t>(2 * stride_) * n, 0);
  for (int c = 0; c < n; ++c) {
    for (int r = 0; r < count_; ++r) {
      mine[c * 2 * stride_ + r] = values(r, c);
      mine[c * 2 * stride_ + stride_ + r] = slopes(r, c);
    }
  }
  return mine;
}

void Extremes::span(const Span& span) {
  const Buffer& mine = rows(*span.topology);
  const int n = quantities_.circuit().size();
  if (last_topology_ == span.topology->id && last_time_ == span.start) {
    first_.swap(last_);
  } else {
    product(mine.data(), 2 * stride_, n, span.x0, first_.data());
  }
  product(mine.data(), 2 * stride_, n, span.x1, last_.data());
  last_topology_ = span.topology->id;
  last_time_ = span.start + span.duration;
  const double h = span.duration;
  for (int i = 0; i < count_; ++i) {
    Range& range = ranges_[i];
    if (first_[i] > range.high) range.high = first_[i], range.high_when = span.start;
    if (first_[i] < range.low) range.low = first_[i], range.low_when = span.start;
    if (last_[i] > range.high) range.high = last_[i], range.high_when = last_time_;
    if (last_[i] < range.low) range.low = last_[i], range.low_when = last_time_;
    const double s0 = first_[stride_ + i], s1 = last_[stride_ + i];
    if (s0 * s1 >= 0) continue;
    // How far the tangents reach beyond the ends: no extreme of a resolved span lies farther out.
    const double reach = h * std::max(std::abs(s0), std::abs(s1));
    if (s0 > 0 ? std::max(first_[i], last_[i]) + reach > range.high : std::min(first_[i], last_[i]) - reach < range.low) {
      refine(span, mine, i, h, &first_[i], &last_[i]);
    }
  }
}

void Extremes::refine(const Span& span, const Buffer& mine, int quantity, double h, const double* at0, const double* at1) {
  double low = 0, high = h, slope_low = at0[stride_], slope_high = at1[stride_];
  const bool top = slope_low > 0;
  const int n = quantities_.circuit().size();
  Range& range = ranges_[quantity];
  double value = 0, tau = 0;
  for (int i = 0; i < 40; ++i) {
    // Where the chord of the slopes is zero (Illinois rule halves the weight of an end that stays).
    tau = low + (high - low) * slope_low / (slope_low - slope_high);
    if (!(tau > low && tau < high)) tau = 0.5 * (low + high);
    span.between->at(tau, state_.data());
    value = 0;
    double slope = 0;
    for (int c = 0; c < n; ++c) {
      value += mine[static_cast<long>(c) * 2 * stride_ + quantity] * state_[c];
      slope += mine[static_cast<long>(c) * 2 * stride_ + stride_ + quantity] * state_[c];
    }
    if (top ? value > range.high : value < range.low) {
      (top ? range.high : range.low) = value;
      (top ? range.high_when : range.low_when) = span.start + tau;
    }
    const bool left = (slope > 0) == top;
    if (std::abs(slope) <= 1e-9 * std::max(std::abs(at0[stride_]), std::abs(at1[stride_]))) return;
    if (left) {
      low = tau, slope_low = slope, slope_high *= 0.5;
    } else {
      high = tau, slope_high = slope, slope_low *= 0.5;
    }
  }
}

}  // namespace couplet
