// SPDX-License-Identifier: MIT
// The few dense loops in which a march spends its time, with run-time choice of the processor's vector width.
// Matrices are column by column, columns padded to `stride` rows (a multiple of 8), 64-byte aligned.
#pragma once

#include <cstdlib>
#include <new>
#include <vector>

namespace couplet {

template <class T>
struct Aligned {
  using value_type = T;
  Aligned() = default;
  template <class U>
  explicit Aligned(const Aligned<U>&) {}
  T* allocate(std::size_t n) { return static_cast<T*>(::operator new(n * sizeof(T), std::align_val_t{64})); }
  void deallocate(T* p, std::size_t) { ::operator delete(p, std::align_val_t{64}); }
  friend bool operator==(const Aligned&, const Aligned&) { return true; }
};
using Buffer = std::vector<double, Aligned<double>>;

inline int padded(int n) { return (n + 7) / 8 * 8; }

/// y = M x (y has `stride` rows)
void product(const double* M, int stride, int columns, const double* x, double* y);
/// y = z + M x
void sum_product(const double* M, int stride, int columns, const double* x, const double* z, double* y);
/// M += x x' (all columns, stride rows)
void add_square(double* M, int stride, int columns, const double* x, double weight);

}  // namespace couplet
