// SPDX-License-Identifier: MIT
#include "engine/figures/harmonics.h"

#include <cmath>
#include <complex>

namespace couplet {

Harmonics::Harmonics(const Quantities& quantities, const std::vector<int>& wanted, double begin, double period, int orders)
    : quantities_(quantities), wanted_(wanted), begin_(begin), period_(period), orders_(orders) {
  sums_ = Eigen::MatrixXcd::Zero(static_cast<int>(wanted.size()), orders + 1);
  x_.resize(quantities.circuit().size());
}

void Harmonics::span(const Span& span) {
  if (static_cast<int>(rows_.size()) <= span.topology->id) rows_.resize(span.topology->id + 1);
  auto& rows = rows_[span.topology->id];
  if (rows.size() == 0) {
    const Eigen::MatrixXd all = quantities_.rows(*span.topology);
    rows.resize(static_cast<int>(wanted_.size()), all.cols());
    for (std::size_t i = 0; i < wanted_.size(); ++i) rows.row(static_cast<int>(i)) = all.row(wanted_[i]);
  }
  constexpr double node[] = {0.1834346424956498, 0.5255324099163290, 0.7966664774136267, 0.9602898564975363};
  constexpr double weight[] = {0.3626837833783620, 0.3137066458778873, 0.2223810344533745, 0.1012285362903763};
  for (int q = 0; q < 4; ++q) {
    for (double side : {-1.0, 1.0}) {
      const double tau = 0.5 * span.duration * (1 + side * node[q]);
      span.between->at(tau, x_.data());
      const Eigen::VectorXd y = rows * x_;
      const double angle = 2 * M_PI * (span.start + tau - begin_) / period_;
      for (int k = 0; k <= orders_; ++k) sums_.col(k) += (0.5 * span.duration * weight[q]) * std::polar(1.0, -k * angle) * y;
    }
  }
}

double Harmonics::amplitude(int i, int order) const {
  return (order == 0 ? 1.0 : 2.0) / period_ * std::abs(sums_(i, order));
}

}  // namespace couplet
