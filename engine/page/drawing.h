// SPDX-License-Identifier: MIT
// Drawings as SVG: panels of lines and min-max bands over a common horizontal axis. Colours that survive colour
// blindness (M. Okabe, K. Ito 2008), and each line has its own dash, so that colour alone never tells.
#pragma once

#include <string>
#include <vector>

namespace couplet {

struct DrawnLine {
  std::string label;
  std::vector<double> x, y;
  std::vector<double> upper;  // where not empty: a band between y and upper
  bool faint = false;         // drawn thin and grey-dashed: an unstable branch, a limit
};

struct DrawnMark {
  double x, y;
  std::string words;
};

struct Panel {
  std::string title, unit;  // of the vertical axis
  std::vector<DrawnLine> lines;
  std::vector<DrawnMark> marks;
};

/// One SVG: a title, the panels one above the other, all over the same x (in `x_unit`, log scale where asked).
std::string draw(const std::string& title, const std::string& x_title, const std::string& x_unit, const std::vector<Panel>& panels, bool log_x = false);

/// Text safe inside XML.
std::string xml_escaped(const std::string& text);

}  // namespace couplet
