// SPDX-License-Identifier: MIT
#include "engine/figures/figure.h"

namespace couplet {

void Figures::set(const std::string& name, double value, const std::string& unit, std::optional<double> when) {
  for (auto& f : all_) {
    if (f.name == name) {
      f = {name, value, unit, when};
      return;
    }
  }
  all_.push_back({name, value, unit, when});
}

const Figure* Figures::find(const std::string& name) const {
  for (const auto& f : all_) {
    if (f.name == name) return &f;
  }
  return nullptr;
}

double Figures::value(const std::string& name) const {
  const Figure* f = find(name);
  return f ? f->value : std::numeric_limits<double>::quiet_NaN();
}

std::vector<std::string> Figures::names() const {
  std::vector<std::string> names;
  for (const auto& f : all_) names.push_back(f.name);
  return names;
}

}  // namespace couplet
