// SPDX-License-Identifier: MIT
// One drawing: the coupling factor over the gap, one curve a shift.
#pragma once

#include <string>
#include <vector>

namespace couplet {

struct CouplingCurve {
  double shift = 0;               // m
  std::vector<double> couplings;  // at each gap
};

/// SVG text, for a page or a browser; gaps in m.
std::string coupling_plot(const std::string& title, const std::vector<double>& gaps,
                          const std::vector<CouplingCurve>& curves);

}  // namespace couplet
