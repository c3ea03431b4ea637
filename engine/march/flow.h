// SPDX-License-Identifier: MIT
// The exact flow of one topology: x(t+h) = exp(A h) x by a ladder of steps h0, 2 h0, 4 h0, ...
//
// Rung k holds E_k = exp(A h_k) - I. The lowest is a Taylor series (largest rate times h0 <= 2^-fineness), each higher
// one follows from E <- 2E + E E. Squaring exp(A h) itself would lose the slow modes beside the stiff ones; the
// difference form keeps them (N. J. Higham, Functions of Matrices, 2008, section 10.3 has the scaling argument).
#pragma once

#include "engine/circuit/circuit.h"
#include "engine/march/kernel.h"

namespace couplet {

class Flow {
 public:
  Flow(const Circuit& circuit, const Topology& topology, int fineness);

  const Topology& topology() const { return topology_; }
  int size() const { return n_; }
  int stride() const { return stride_; }
  int watches() const { return watches_; }
  int watch_stride() const { return watch_stride_; }

  double finest() const { return finest_; }
  double rung_length(int k) const { return finest_ * static_cast<double>(1ULL << k); }
  /// The highest rung whose length is at most h, not above the top; -1 where even the finest is longer.
  int rung_below(double h) const;
  static constexpr int top = 46;

  /// y = exp(A h_k) x; builds the rung at its first use. x and y have stride() values, x's padding is zero.
  void step(int rung, const double* x, double* y) const;
  /// Values, slopes and second derivatives of all watches: 3 blocks of watch_stride().
  void guards(const double* x, double* out) const;
  /// Taylor coefficients of x(t + d) = sum_j terms[j] d^j, j = 0..order; each stride() values.
  void series(const double* x, double* terms) const;
  static constexpr int order = 9;
  /// Sum of the sizes of a watch's terms, for its round-off.
  double watch_scale(int watch, const double* x) const;
  double slope_scale(int watch, const double* x) const;
  double watch_value(int watch, const double* x) const;

  /// integral over [0, length of rung] of exp(A s) M exp(A' s) ds summed over all rungs: rung_squares[k] is the sum of
  /// x0 x0' over steps on rung k (n x n, may be empty).
  Eigen::MatrixXd integrate_squares(const std::vector<Buffer>& rung_squares) const;
  double seconds_building() const { return seconds_; }

 private:
  void build(int rung) const;

  const Topology& topology_;
  int n_, stride_, watches_, watch_stride_;
  double finest_ = 0;
  Buffer A_, guard_rows_, row_sizes_, slope_sizes_;
  mutable std::vector<Buffer> rungs_;
  mutable double seconds_ = 0;
};

}  // namespace couplet
