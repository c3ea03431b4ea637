// SPDX-License-Identifier: MIT
#include "engine/quantity/quantity.h"

#include <fmt/format.h>
#include <udunits2.h>

#include <array>
#include <cmath>
#include <cstdlib>
#include <mutex>

namespace couplet {
namespace {

struct Prefix {
  const char* text;
  int exponent;
};
constexpr std::array<Prefix, 12> prefixes = {{{"f", -15},
                                              {"p", -12},
                                              {"n", -9},
                                              {"u", -6},
                                              {"\u00b5", -6},
                                              {"m", -3},
                                              {"", 0},
                                              {"k", 3},
                                              {"M", 6},
                                              {"G", 9},
                                              {"T", 12},
                                              {"c", -2}}};
// Units whose prefixed forms are decimal shifts of the SI unit itself.
constexpr std::array<const char*, 13> plain_units = {"ohm", "V", "A", "F", "H", "s", "Hz",
                                                     "W",   "J", "S", "m", "T", "C"};

/// UDUNITS-2 keeps global state and is not safe from two threads.
class UnitSystem {
 public:
  static UnitSystem& instance() {
    static UnitSystem system;
    return system;
  }
  /// Factor and offset from `from` to `to`: 0 good, 1 unknown unit, 2 other dimension.
  int converter(const std::string& from, const std::string& to, double& slope, double& offset) {
    const std::lock_guard<std::mutex> lock(mutex_);
    ut_unit* a = ut_parse(system_, from.c_str(), UT_UTF8);
    if (!a) return 1;
    ut_unit* b = ut_parse(system_, to.c_str(), UT_UTF8);
    int result = 2;
    if (b && ut_are_convertible(a, b)) {
      if (cv_converter* c = ut_get_converter(a, b)) {
        offset = cv_convert_double(c, 0.0);
        slope = cv_convert_double(c, 1.0) - offset;
        cv_free(c);
        result = 0;
      }
    }
    ut_free(a);
    if (b) ut_free(b);
    return result;
  }

 private:
  UnitSystem() {
    ut_set_error_message_handler(ut_ignore);  // it would print on its own
    system_ = ut_read_xml(nullptr);
  }
  ut_system* system_ = nullptr;
  std::mutex mutex_;
};

std::string trimmed(const std::string& s) {
  const auto first = s.find_first_not_of(" \t");
  return first == std::string::npos ? "" : s.substr(first, s.find_last_not_of(" \t") - first + 1);
}

std::string name_of(const std::string& unit) { return unit == "1" ? "a plain number or a percentage" : unit; }

}  // namespace

ReadQuantity read_quantity(const std::string& text, const std::string& unit) {
  const std::string whole = trimmed(text);
  const char* begin = whole.c_str();
  char* end = nullptr;
  const double number = std::strtod(begin, &end);
  const bool starts = end != begin && (std::isdigit(static_cast<unsigned char>(*begin)) || *begin == '-' ||
                                       *begin == '+' || *begin == '.');
  if (!starts || whole.find_first_of("xX") < static_cast<std::size_t>(end - begin)) {
    return {0, fmt::format("\"{}\" does not begin with a number; write it like \"10 {}\"", text,
                           unit == "1" ? "%" : unit)};
  }
  if (!std::isfinite(number)) return {0, fmt::format("\"{}\" is not a finite number", text)};
  const std::string mantissa(begin, static_cast<const char*>(end));
  const std::string given = trimmed(end);
  if (given.empty()) {
    if (unit == "1") return {number, ""};
    return {0, fmt::format("\"{}\" has no unit; write it in {}, like \"{} {}\"", text, unit, whole, unit)};
  }
  for (const char* plain : plain_units) {
    if (unit != plain) continue;
    for (const auto& p : prefixes) {
      if (given != std::string(p.text) + plain) continue;
      if (p.exponent == 0) return {number, ""};
      if (mantissa.find_first_of("eE") == std::string::npos)
        return {std::strtod(fmt::format("{}e{}", mantissa, p.exponent).c_str(), nullptr), ""};
      return {number * std::pow(10.0, p.exponent), ""};
    }
  }
  if (given == "%" && unit == "1") return {std::strtod(fmt::format("{}", number).c_str(), nullptr) / 100, ""};
  double slope = 1, offset = 0;
  switch (UnitSystem::instance().converter(given, unit, slope, offset)) {
    case 1:
      return {0, fmt::format("\"{}\" is no unit that is known; use {}", given, name_of(unit))};
    case 2:
      return {0,
              fmt::format("\"{}\" has another dimension than is wanted here; use {}", given, name_of(unit))};
    default:
      return {number * slope + offset, ""};
  }
}

std::string print_quantity(double value, const std::string& unit, int digits) {
  if (std::isnan(value)) return "not known";
  if (std::isinf(value)) return value > 0 ? "unlimited" : "-unlimited";
  if (unit == "1" || unit.empty()) return fmt::format("{:.{}g}", value, digits);
  if (value == 0) return fmt::format("0 {}", unit);
  // Round first, then choose the prefix: 999.96 ohm with four digits is 1 kohm.
  const double rounded = std::strtod(fmt::format("{:.{}e}", value, digits - 1).c_str(), nullptr);
  int exponent = static_cast<int>(std::floor(std::log10(std::abs(rounded)) + 1e-12));
  exponent = static_cast<int>(std::floor(exponent / 3.0)) * 3;
  bool prefixed = false;
  for (const char* plain : plain_units) prefixed = prefixed || unit == plain;
  if (!prefixed) return fmt::format("{:.{}g} {}", rounded, digits, unit);
  exponent = std::min(std::max(exponent, -15), 12);
  for (const auto& p : prefixes) {
    if (p.exponent != exponent || std::string(p.text) == "\u00b5") continue;
    return fmt::format("{:.{}g} {}{}", rounded / std::pow(10.0, exponent), digits, p.text, unit);
  }
  return fmt::format("{:.{}g} {}", rounded, digits, unit);
}

}  // namespace couplet
