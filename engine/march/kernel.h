// SPDX-License-Identifier: MIT
// The few dense loops in which a march spends its time, with run-time choice of the processor's vector width.
// Matrices are column by column, columns padded to `stride` rows (a multiple of 8), 64-byte aligned.
#pragma once

#include <cstdlib>
#include <new>
#include <vector>

// GCC builds one body for each target and the loader picks; sanitizers start too late for that.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__SANITIZE_ADDRESS__)
#define COUPLET_WIDE __attribute__((target_clones("default", "arch=x86-64-v3", "arch=x86-64-v4")))
#else
#define COUPLET_WIDE
#endif

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
