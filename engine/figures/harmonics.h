// SPDX-License-Identifier: MIT
// Harmonics of quantities over one exact period: amplitude of order k is |2/T integral of y exp(-j k w t) dt|.
#pragma once

#include "engine/figures/quantities.h"
#include "engine/march/march.h"

namespace couplet {

/// Sums the Fourier integrals span by span, by Gauss-Legendre points on each span's exact interpolant (8 to a span; spans
/// are short against the period, and a stiff transient has died within a span or has no charge).
class Harmonics : public Observer {
 public:
  /// Of the quantities named, orders 0 to `orders`, of a period that begins at `begin`.
  Harmonics(const Quantities& quantities, const std::vector<int>& wanted, double begin, double period, int orders);
  void span(const Span& span) override;
  /// Amplitude of order k of the i-th wanted quantity (order 0: the mean).
  double amplitude(int i, int order) const;

 private:
  const Quantities& quantities_;
  std::vector<int> wanted_;
  double begin_, period_;
  int orders_;
  Eigen::MatrixXcd sums_;
  std::vector<Eigen::MatrixXd> rows_;
  Eigen::VectorXd x_;
};

}  // namespace couplet
