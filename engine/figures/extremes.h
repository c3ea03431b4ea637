// SPDX-License-Identifier: MIT
// Largest and smallest value of every watched quantity over a march, and when. Between the ends of a span an extreme is
// sought where the slope changes its sign, and refined on the march's own interpolant: the error of an extreme is of
// second order in the error of its time. A span over which values and slopes contradict the second derivatives (crossing.h)
// hides more than one turn, and is halved first.
#pragma once

#include "engine/figures/quantities.h"
#include "engine/march/kernel.h"
#include "engine/march/march.h"

namespace couplet {

class Extremes : public Observer {
 public:
  struct Range {
    double low = std::numeric_limits<double>::infinity(), high = -std::numeric_limits<double>::infinity();
    double low_when = 0, high_when = 0;
  };
  explicit Extremes(const Quantities& quantities);
  void span(const Span& span) override;
  void clear();
  const std::vector<Range>& ranges() const { return ranges_; }
  const Quantities& quantities() const { return quantities_; }

 private:
  static constexpr int most_halvings = 8;
  const Buffer& rows(const Topology& topology);
  void piece(const Span& span, const Buffer& rows, double from, double to, const double* at0, const double* at1, int depth);
  void refine(const Span& span, const Buffer& rows, int quantity, double from, double to, const double* at0, const double* at1);

  const Quantities& quantities_;
  int count_, stride_;
  std::vector<Buffer> rows_;  // by topology: values, slopes, second derivatives, 3 * stride_ rows
  std::vector<Range> ranges_;
  Buffer first_, last_, state_;
  std::vector<Buffer> halves_;  // by depth of halving
  int last_topology_ = -1;
  double last_time_ = 0;
};

}  // namespace couplet
