// SPDX-License-Identifier: MIT
#include "engine/figures/extremes.h"

#include <cmath>

#include "engine/march/crossing.h"

namespace couplet {

Extremes::Extremes(const Quantities& quantities)
    : quantities_(quantities), count_(static_cast<int>(quantities.all().size())), stride_(padded(std::max(count_, 1))) {
  ranges_.resize(count_);
  first_.assign(3 * stride_, 0);
  last_ = first_;
  halves_.assign(most_halvings + 1, first_);
  state_.assign(padded(quantities.circuit().size()), 0);
}

void Extremes::clear() { ranges_.assign(count_, {}); }

const Buffer& Extremes::rows(const Topology& topology) {
  if (static_cast<int>(rows_.size()) <= topology.id) rows_.resize(topology.id + 1);
  Buffer& mine = rows_[topology.id];
  if (!mine.empty()) return mine;
  const int n = quantities_.circuit().size();
  const Eigen::MatrixXd values = quantities_.rows(topology), slopes = values * topology.A, curves = slopes * topology.A;
  mine.assign(static_cast<std::size_t>(3 * stride_) * n, 0);
  for (int c = 0; c < n; ++c) {
    for (int r = 0; r < count_; ++r) {
      mine[c * 3 * stride_ + r] = values(r, c);
      mine[c * 3 * stride_ + stride_ + r] = slopes(r, c);
      mine[c * 3 * stride_ + 2 * stride_ + r] = curves(r, c);
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
    product(mine.data(), 3 * stride_, n, span.x0, first_.data());
  }
  product(mine.data(), 3 * stride_, n, span.x1, last_.data());
  last_topology_ = span.topology->id;
  last_time_ = span.start + span.duration;
  for (int i = 0; i < count_; ++i) {
    Range& range = ranges_[i];
    if (first_[i] > range.high) range.high = first_[i], range.high_when = span.start;
    if (first_[i] < range.low) range.low = first_[i], range.low_when = span.start;
  }
  piece(span, mine, 0, span.duration, first_.data(), last_.data(), 0);
}

void Extremes::piece(const Span& span, const Buffer& mine, double from, double to, const double* at0, const double* at1, int depth) {
  const double h = to - from;
  bool unresolved = false;
  for (int i = 0; i < count_; ++i) {
    Range& range = ranges_[i];
    const double when = span.start + to;
    if (at1[i] > range.high) range.high = at1[i], range.high_when = when;
    if (at1[i] < range.low) range.low = at1[i], range.low_when = when;
    // doubt() / 16 bounds how far the quantity strays from the cubic; a hundredth of the range is a turn that matters.
    const GuardStep step{at0[i], h * at0[stride_ + i], h * h * at0[2 * stride_ + i], at1[i], h * at1[stride_ + i], h * h * at1[2 * stride_ + i]};
    unresolved = unresolved || step.doubt() > 0.16 * (range.high - range.low);
  }
  if (unresolved && depth < most_halvings) {
    const double middle = 0.5 * (from + to);
    Buffer& half = halves_[depth];
    span.between->at(middle, state_.data());
    product(mine.data(), 3 * stride_, quantities_.circuit().size(), state_.data(), half.data());
    piece(span, mine, from, middle, at0, half.data(), depth + 1);
    piece(span, mine, middle, to, half.data(), at1, depth + 1);
    return;
  }
  for (int i = 0; i < count_; ++i) {
    const Range& range = ranges_[i];
    const double s0 = at0[stride_ + i], s1 = at1[stride_ + i];
    if (s0 * s1 >= 0) continue;
    // How far the tangents reach beyond the ends: no extreme of a resolved span lies farther out.
    const double reach = h * std::max(std::abs(s0), std::abs(s1));
    if (s0 > 0 ? std::max(at0[i], at1[i]) + reach > range.high : std::min(at0[i], at1[i]) - reach < range.low) {
      refine(span, mine, i, from, to, at0 + i, at1 + i);
    }
  }
}

void Extremes::refine(const Span& span, const Buffer& mine, int quantity, double from, double to, const double* at0, const double* at1) {
  double low = from, high = to, slope_low = at0[stride_], slope_high = at1[stride_];
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
      value += mine[static_cast<long>(c) * 3 * stride_ + quantity] * state_[c];
      slope += mine[static_cast<long>(c) * 3 * stride_ + stride_ + quantity] * state_[c];
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
