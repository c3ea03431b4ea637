// SPDX-License-Identifier: MIT
// Text with a unit -> SI value, and back for print. UDUNITS-2 knows the units; plain prefixed SI units are
// converted by shifting the decimal point in the text, so that "4.7 uF" is the double nearest to 4.7e-6.
#pragma once

#include <string>

namespace couplet {

struct ReadQuantity {
  double value = 0;     // SI, in `unit`
  std::string problem;  // empty: good; otherwise what is wrong and what to do
};

/// Reads "10 ohm", "4.7 uF", "20 %", "1.5" as a value in `unit` ("ohm"; "1" for a ratio or a count). A
/// missing unit is an error unless `unit` is "1"; so is a unit of another dimension.
ReadQuantity read_quantity(const std::string& text, const std::string& unit);

/// "4.7 uF", "157.48 kHz", "93.7 %" (unit "1" prints as a plain number): `digits` significant digits, prefix
/// chosen after rounding.
std::string print_quantity(double value, const std::string& unit, int digits = 4);

}  // namespace couplet
