// SPDX-License-Identifier: MIT
#include "engine/command/coil_plot.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace couplet {
namespace {

constexpr double width = 760, height = 460, left = 70, right = 130, top = 50, bottom = 60;

/// 1, 2 or 5 times a power of ten, so that about `count` marks fit.
double mark_step(double span, int count) {
  const double rough = span / count, power = std::pow(10, std::floor(std::log10(rough))),
               share = rough / power;
  return power * (share <= 1 ? 1 : share <= 2 ? 2 : share <= 5 ? 5 : 10);
}

std::string escaped(const std::string& text) {
  std::string out;
  for (const char c : text) out += c == '<' ? "&lt;" : c == '&' ? "&amp;" : std::string(1, c);
  return out;
}

}  // namespace

std::string coupling_plot(const std::string& title, const std::vector<double>& gaps,
                          const std::vector<CouplingCurve>& curves) {
  double low = 0, high = 0;
  for (const auto& c : curves)
    for (const double k : c.couplings) low = std::min(low, k), high = std::max(high, k);
  const double step_k = mark_step(std::max(high - low, 1e-6), 6);
  low = std::floor(low / step_k + 1e-9) * step_k, high = std::ceil(high / step_k - 1e-9) * step_k;
  const double from = gaps.front(), to = gaps.size() > 1 ? gaps.back() : from + 1e-3;
  const auto x = [&](double gap) { return left + (width - left - right) * (gap - from) / (to - from); };
  const auto y = [&](double k) {
    return height - bottom - (height - top - bottom) * (k - low) / (high - low);
  };

  std::string svg = fmt::format(
      "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {0} {1}\" width=\"{0}\" height=\"{1}\" "
      "font-family=\"sans-serif\" font-size=\"13\">\n"
      "<rect width=\"{0}\" height=\"{1}\" fill=\"white\"/>\n<text x=\"{2}\" y=\"26\" "
      "font-size=\"16\">{3}</text>\n",
      width, height, left, escaped(title));
  for (double k = low; k <= high + 0.5 * step_k; k += step_k)
    svg += fmt::format(
        "<line x1=\"{0:.1f}\" x2=\"{1:.1f}\" y1=\"{2:.1f}\" y2=\"{2:.1f}\" stroke=\"{5}\"/><text "
        "x=\"{3:.1f}\" y=\"{4:.1f}\" text-anchor=\"end\">{6:.4g}</text>\n",
        left, width - right, y(k), left - 8, y(k) + 4, std::abs(k) < 1e-9 ? "#444" : "#ddd",
        std::abs(k) < 1e-9 ? 0.0 : k);
  const double step_gap = mark_step((to - from) * 1e3, 8);
  for (double gap = std::ceil(from * 1e3 / step_gap - 1e-9) * step_gap; gap <= to * 1e3 + 1e-6;
       gap += step_gap)
    svg += fmt::format(
        "<line x1=\"{0:.1f}\" x2=\"{0:.1f}\" y1=\"{1:.1f}\" y2=\"{2:.1f}\" stroke=\"#ddd\"/><text "
        "x=\"{0:.1f}\" y=\"{3:.1f}\" text-anchor=\"middle\">{4:.4g}</text>\n",
        x(gap * 1e-3), top, height - bottom, height - bottom + 18, gap);
  svg += fmt::format("<text x=\"{:.1f}\" y=\"{:.1f}\" text-anchor=\"middle\">gap, mm</text>\n",
                     (left + width - right) / 2, height - bottom + 40);
  svg += fmt::format(
      "<text x=\"18\" y=\"{0:.1f}\" text-anchor=\"middle\" transform=\"rotate(-90 18 {0:.1f})\">coupling "
      "factor</text>\n",
      (top + height - bottom) / 2);

  // Labels stand at the curves' right ends, moved apart where they would cover each other.
  std::vector<size_t> order(curves.size());
  for (size_t i = 0; i < order.size(); ++i) order[i] = i;
  std::sort(order.begin(), order.end(),
            [&](size_t a, size_t b) { return curves[a].couplings.back() > curves[b].couplings.back(); });
  double last = -1e9;
  for (const size_t i : order) {
    const double share = curves.size() > 1 ? i / double(curves.size() - 1) : 0;
    const std::string colour = fmt::format("hsl({:.0f} 65% {:.0f}%)", 205 - 180 * share, 38 + 8 * share);
    std::string points;
    for (size_t n = 0; n < gaps.size(); ++n)
      points += fmt::format("{:.1f},{:.1f} ", x(gaps[n]), y(curves[i].couplings[n]));
    svg += fmt::format("<polyline points=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"2\"/>\n", points,
                       colour);
    const double label = std::max(y(curves[i].couplings.back()) + 4, last + 15);
    svg += fmt::format("<text x=\"{:.1f}\" y=\"{:.1f}\" fill=\"{}\">shift {:.4g} mm</text>\n",
                       width - right + 8, label, colour, curves[i].shift * 1e3);
    last = label;
  }
  return svg + "</svg>\n";
}

}  // namespace couplet
