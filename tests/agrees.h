// SPDX-License-Identifier: MIT
// The one way in which tests compare numbers: a tolerance is a value with a reason.
#pragma once
#include <cmath>
#include <string>

#include <catch2/catch.hpp>

namespace couplet::test {

struct Tolerance {
  double relative = 0;   // of |expected|
  double floor = 0;      // absolute, in the unit of the value
  std::string because;   // required: where the tolerance comes from
};

/// True where |value - expected| <= relative |expected| + floor; both must be finite.
inline bool agrees(double value, double expected, const Tolerance& tolerance) {
  if (tolerance.because.empty()) FAIL("a tolerance without a reason");
  const double allowed = tolerance.relative * std::abs(expected) + tolerance.floor;
  const bool good = std::isfinite(value) && std::isfinite(expected) && std::abs(value - expected) <= allowed;
  if (!good) {
    UNSCOPED_INFO("value " << Catch::StringMaker<double>::convert(value) << ", expected "
                           << Catch::StringMaker<double>::convert(expected) << ", off by " << value - expected
                           << " where " << allowed << " is allowed: " << tolerance.because);
  }
  return good;
}

}  // namespace couplet::test
