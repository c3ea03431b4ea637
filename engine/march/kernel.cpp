// SPDX-License-Identifier: MIT
#include "engine/march/kernel.h"

namespace couplet {
namespace {
typedef double Eight __attribute__((vector_size(64), aligned(64), may_alias));
}

COUPLET_WIDE
void product(const double* M, int stride, int columns, const double* x, double* y) {
  for (int r = 0; r < stride; r += 8) {
    Eight even = {}, odd = {};
    const double* m = M + r;
    int c = 0;
    for (; c + 1 < columns; c += 2) {
      even += *reinterpret_cast<const Eight*>(m) * x[c];
      odd += *reinterpret_cast<const Eight*>(m + stride) * x[c + 1];
      m += 2 * stride;
    }
    if (c < columns) even += *reinterpret_cast<const Eight*>(m) * x[c];
    *reinterpret_cast<Eight*>(y + r) = even + odd;
  }
}

COUPLET_WIDE
void sum_product(const double* M, int stride, int columns, const double* x, const double* z, double* y) {
  for (int r = 0; r < stride; r += 8) {
    Eight even = {}, odd = {};
    const double* m = M + r;
    int c = 0;
    for (; c + 1 < columns; c += 2) {
      even += *reinterpret_cast<const Eight*>(m) * x[c];
      odd += *reinterpret_cast<const Eight*>(m + stride) * x[c + 1];
      m += 2 * stride;
    }
    if (c < columns) even += *reinterpret_cast<const Eight*>(m) * x[c];
    *reinterpret_cast<Eight*>(y + r) = *reinterpret_cast<const Eight*>(z + r) + (even + odd);
  }
}

COUPLET_WIDE
void add_square(double* M, int stride, int columns, const double* x, double weight) {
  for (int c = 0; c < columns; ++c) {
    const double k = x[c] * weight;
    double* m = M + static_cast<long>(c) * stride;
    for (int r = 0; r < stride; r += 8) {
      *reinterpret_cast<Eight*>(m + r) += *reinterpret_cast<const Eight*>(x + r) * k;
    }
  }
}

}  // namespace couplet
