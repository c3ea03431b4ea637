// SPDX-License-Identifier: MIT
// Named numbers with units, in the order in which they were found.
#pragma once

#include <limits>
#include <optional>
#include <string>
#include <vector>

namespace couplet {

struct Figure {
  std::string name;
  double value = std::numeric_limits<double>::quiet_NaN();
  std::string unit;            // SI
  std::optional<double> when;  // s, where an extreme occurs
};

class Figures {
 public:
  void set(const std::string& name, double value, const std::string& unit, std::optional<double> when = {});
  const Figure* find(const std::string& name) const;
  double value(const std::string& name) const;  // NaN where there is none
  const std::vector<Figure>& all() const { return all_; }
  std::vector<std::string> names() const;

 private:
  std::vector<Figure> all_;
};

}  // namespace couplet
