// SPDX-License-Identifier: MIT
#include "engine/page/drawing.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

constexpr double width = 860, left = 86, right = 34, panel_height = 190, gap = 46, top = 50;
constexpr std::array<const char*, 6> colours = {"#0072b2", "#d55e00", "#009e73", "#cc79a7", "#8a6d00", "#444444"};
constexpr std::array<const char*, 6> dashes = {"", "7 3", "2 3", "9 3 2 3", "4 4", "12 4"};

struct Axis {
  double low, high, from, to;
  bool log = false;
  double at(double v) const {
    const double share = log ? std::log(v / low) / std::log(high / low) : (v - low) / (high - low);
    return from + share * (to - from);
  }
};

/// Round steps of 1, 2 or 5 times a power of ten, about `wanted` of them.
std::vector<double> ticks(const Axis& axis, int wanted) {
  std::vector<double> list;
  if (axis.log) {
    for (double decade = std::pow(10.0, std::floor(std::log10(axis.low))); decade <= axis.high; decade *= 10) {
      for (double m : {1.0, 2.0, 5.0}) {
        if (m * decade >= axis.low * (1 - 1e-9) && m * decade <= axis.high * (1 + 1e-9)) list.push_back(m * decade);
      }
    }
    if (list.size() >= 2) return list;
    list.clear();
  }
  const double raw = (axis.high - axis.low) / wanted, power = std::pow(10.0, std::floor(std::log10(raw)));
  const double step = raw / power < 1.5 ? power : raw / power < 3.5 ? 2 * power : raw / power < 7.5 ? 5 * power : 10 * power;
  for (double v = std::ceil(axis.low / step - 1e-9) * step; v <= axis.high + 1e-9 * step; v += step) list.push_back(std::abs(v) < 1e-9 * step ? 0 : v);
  return list;
}

/// As many digits as tell two neighbouring ticks apart.
int digits_for(const std::vector<double>& list) {
  if (list.size() < 2) return 4;
  const double step = std::abs(list[1] - list[0]), largest = std::max(std::abs(list.front()), std::abs(list.back()));
  return std::clamp(static_cast<int>(std::ceil(std::log10(largest / step) - 1e-9)) + 1, 3, 12);
}

std::string points(const Axis& x, const Axis& y, const std::vector<double>& xs, const std::vector<double>& ys) {
  std::string text;
  for (std::size_t i = 0; i < xs.size(); ++i) {
    if (std::isfinite(ys[i])) text += fmt::format("{:.1f},{:.1f} ", x.at(xs[i]), y.at(ys[i]));
  }
  return text;
}

void draw_panel(std::string& svg, const Panel& panel, const Axis& x, const std::string& x_unit, double y0) {
  double low = std::numeric_limits<double>::infinity(), high = -low;
  for (const auto& line : panel.lines) {
    for (double v : line.y) {
      if (std::isfinite(v)) low = std::min(low, v), high = std::max(high, v);
    }
    for (double v : line.upper) {
      if (std::isfinite(v)) high = std::max(high, v);
    }
  }
  if (!(low <= high)) low = 0, high = 1;
  if (low == high) low -= std::abs(low) * 0.05 + 1e-12, high += std::abs(high) * 0.05 + 1e-12;
  const double room = 0.06 * (high - low);
  const Axis y{low - room, high + room, y0 + panel_height, y0};
  svg += fmt::format("<text x='{}' y='{}' class='panel'>{}</text>\n", left, y0 - 8, xml_escaped(panel.title));
  const auto y_ticks = ticks(y, 5), x_ticks = ticks(x, 8);
  for (double v : y_ticks) {
    svg += fmt::format("<line x1='{}' x2='{}' y1='{:.1f}' y2='{:.1f}' class='grid'/><text x='{}' y='{:.1f}' class='tick' text-anchor='end'>{}</text>\n", left, width - right, y.at(v), y.at(v),
                       left - 6, y.at(v) + 4, print_quantity(v, panel.unit, digits_for(y_ticks)));
  }
  for (double v : x_ticks) {
    svg += fmt::format("<line x1='{:.1f}' x2='{:.1f}' y1='{}' y2='{}' class='grid'/><text x='{:.1f}' y='{}' class='tick' text-anchor='middle'>{}</text>\n", x.at(v), x.at(v), y0, y0 + panel_height,
                       x.at(v), y0 + panel_height + 15, print_quantity(v, x_unit, digits_for(x_ticks)));
  }
  svg += fmt::format("<rect x='{}' y='{}' width='{}' height='{}' class='frame'/>\n", left, y0, width - left - right, panel_height);
  double legend = width - right - 8;
  for (std::size_t i = panel.lines.size(); i-- > 0;) {
    const auto& line = panel.lines[i];
    const char* colour = line.faint ? "#777777" : colours[i % colours.size()];
    const char* dash = line.faint ? "3 4" : dashes[i % dashes.size()];
    if (!line.upper.empty()) {
      auto xs = line.x;
      auto ys = line.y;
      xs.insert(xs.end(), line.x.rbegin(), line.x.rend());
      ys.insert(ys.end(), line.upper.rbegin(), line.upper.rend());
      svg += fmt::format("<polygon points='{}' fill='{}' fill-opacity='0.35' stroke='{}' stroke-width='0.6'/>\n", points(x, y, xs, ys), colour, colour);
    } else {
      svg += fmt::format("<polyline points='{}' fill='none' stroke='{}' stroke-width='{}' stroke-dasharray='{}'/>\n", points(x, y, line.x, line.y), colour, line.faint ? 1.0 : 1.6, dash);
    }
    if (line.label.empty()) continue;
    svg += fmt::format("<text x='{:.1f}' y='{}' class='tick' text-anchor='end'>{}</text>\n", legend, y0 - 8, xml_escaped(line.label));
    legend -= 6.6 * static_cast<double>(line.label.size()) + 6;
    svg += fmt::format("<line x1='{:.1f}' x2='{:.1f}' y1='{}' y2='{}' stroke='{}' stroke-width='{}' stroke-dasharray='{}'/>\n", legend - 26, legend, y0 - 12, y0 - 12, colour, line.upper.empty() ? 2 : 6, dash);
    legend -= 40;
  }
  for (const auto& mark : panel.marks) {
    svg += fmt::format("<circle cx='{:.1f}' cy='{:.1f}' r='4' fill='none' stroke='#000' stroke-width='1.4'/><text x='{:.1f}' y='{:.1f}' class='tick'>{}</text>\n", x.at(mark.x), y.at(mark.y),
                       std::min(x.at(mark.x) + 7, width - 260), y.at(mark.y) - 7, xml_escaped(mark.words));
  }
}

}  // namespace

std::string xml_escaped(const std::string& text) {
  std::string out;
  for (const char c : text) {
    switch (c) {
      case '<': out += "&lt;"; break;
      case '>': out += "&gt;"; break;
      case '&': out += "&amp;"; break;
      case '"': out += "&quot;"; break;
      case '\'': out += "&#39;"; break;
      default: out += static_cast<unsigned char>(c) < 0x20 ? ' ' : c;
    }
  }
  return out;
}

std::string draw(const std::string& title, const std::string& x_title, const std::string& x_unit, const std::vector<Panel>& panels, bool log_x) {
  double low = std::numeric_limits<double>::infinity(), high = -low;
  for (const auto& panel : panels) {
    for (const auto& line : panel.lines) {
      for (double v : line.x) low = std::min(low, v), high = std::max(high, v);
    }
  }
  if (!(low < high)) low = 0, high = 1;
  const Axis x{low, high, left, width - right, log_x && low > 0};
  const double height = top + static_cast<double>(panels.size()) * (panel_height + gap) + 14;
  std::string svg = fmt::format(
      "<svg xmlns='http://www.w3.org/2000/svg' viewBox='0 0 {} {}' width='{}' height='{}' role='img' aria-label='{}'>\n"
      "<style>text{{font-family:Georgia,'DejaVu Serif',serif;fill:#222}} .title{{font-size:17px}} .panel{{font-size:13px}} .tick{{font-size:11px}} "
      ".grid{{stroke:#cfd6cf;stroke-width:0.7}} .frame{{fill:none;stroke:#555;stroke-width:1}}</style>\n<rect width='100%' height='100%' fill='#fdfdf8'/>\n"
      "<text x='{}' y='26' class='title'>{}</text>\n",
      width, height, width, height, xml_escaped(title), left, xml_escaped(title));
  double y0 = top + 12;
  for (const auto& panel : panels) {
    draw_panel(svg, panel, x, x_unit, y0);
    y0 += panel_height + gap;
  }
  svg += fmt::format("<text x='{}' y='{}' class='tick' text-anchor='middle'>{}</text>\n</svg>\n", (left + width - right) / 2, height - 4, xml_escaped(x_title));
  return svg;
}

}  // namespace couplet
