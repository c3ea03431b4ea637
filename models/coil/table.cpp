// SPDX-License-Identifier: MIT
#include "models/coil/table.h"

#include <algorithm>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <cstdio>

namespace couplet::coil {
namespace {

std::string place(const Position& p) {
  char text[120];
  std::snprintf(text, sizeof text, "gap %.6g mm, shift %.6g mm, tilt %.6g deg", p.gap * 1e3, p.shift * 1e3,
                p.tilt * 180 / 3.14159265358979323846);
  return text;
}

std::string number(double value) {
  char text[40];
  std::snprintf(text, sizeof text, "%.4g", value);
  return text;
}

/// Two positions closer than this share of the axis' span are the same point written twice.
constexpr double same = 1e-9;

std::vector<double> axis_of(std::vector<double> values) {
  std::sort(values.begin(), values.end());
  const double near = same * std::max(std::abs(values.front()), std::abs(values.back()));
  std::vector<double> axis;
  for (const double v : values)
    if (axis.empty() || v - axis.back() > near) axis.push_back(v);
  return axis;
}

size_t nearest(const std::vector<double>& axis, double value) {
  size_t best = 0;
  for (size_t i = 1; i < axis.size(); ++i)
    if (std::abs(axis[i] - value) < std::abs(axis[best] - value)) best = i;
  return best;
}

size_t cell(const std::vector<double>& axis, double at) {
  const auto above = std::upper_bound(axis.begin(), axis.end(), at);
  const size_t i = above == axis.begin() ? 0 : above - axis.begin() - 1;
  return std::min(i, axis.size() - 2);
}

/// Slope at a node between two secants (Fritsch and Butland 1984): zero at an extremum, else a weighted
/// harmonic mean.
double inner_slope(double left_step, double right_step, double left, double right) {
  if (left * right <= 0) return 0;
  const double w1 = 2 * right_step + left_step, w2 = right_step + 2 * left_step;
  return (w1 + w2) / (w1 / left + w2 / right);
}

/// Slope at an end from three points, kept from overshooting.
double end_slope(double step, double next_step, double secant, double next_secant) {
  const double slope = ((2 * step + next_step) * secant - step * next_secant) / (step + next_step);
  if (slope * secant <= 0) return 0;
  if (secant * next_secant <= 0 && std::abs(slope) > 3 * std::abs(secant)) return 3 * secant;
  return slope;
}

/// Value at `at` in cell `i`; `value(n)` gives the node n, asked only for nodes i-1 .. i+2.
template <class Value>
double cubic(const std::vector<double>& axis, size_t i, double at, const Value& value) {
  const size_t last = axis.size() - 1;
  const double h = axis[i + 1] - axis[i], y0 = value(i), y1 = value(i + 1), secant = (y1 - y0) / h;
  double slope0 = secant, slope1 = secant;
  double before_step = 0, before = 0, after_step = 0, after = 0;
  if (i > 0) before_step = axis[i] - axis[i - 1], before = (y0 - value(i - 1)) / before_step;
  if (i + 1 < last) after_step = axis[i + 2] - axis[i + 1], after = (value(i + 2) - y1) / after_step;
  if (i > 0)
    slope0 = inner_slope(before_step, h, before, secant);
  else if (i + 1 < last)
    slope0 = end_slope(h, after_step, secant, after);
  if (i + 1 < last)
    slope1 = inner_slope(h, after_step, secant, after);
  else if (i > 0)
    slope1 = end_slope(h, before_step, secant, before);
  const double t = (at - axis[i]) / h, u = 1 - t;
  return y0 * u * u * (1 + 2 * t) + y1 * t * t * (1 + 2 * u) + h * t * u * (slope0 * u - slope1 * t);
}

std::string all_of(const std::vector<TableComplaint>& list) {
  std::string text;
  for (const TableComplaint& c : list) {
    if (!text.empty()) text += "\n";
    if (c.row > 0) text += "row " + std::to_string(c.row) + ": ";
    text += c.text;
  }
  return text;
}

void check_row(const TableRow& row, int number_of_row, bool resistances, std::vector<TableComplaint>& list) {
  const PairValues& v = row.values;
  const Position& p = row.position;
  const auto add = [&](const std::string& what) { list.push_back({number_of_row, place(p) + ": " + what}); };
  if (!std::isfinite(p.gap + p.shift + p.tilt)) return add("the position is not a number");
  if (!(v.first > 0) || !(v.second > 0)) return add("both self-inductances must be positive");
  if (!std::isfinite(v.first + v.second + v.mutual)) return add("an inductance is not a number");
  const double k = v.mutual / std::sqrt(v.first * v.second);
  if (!(std::abs(k) < 1))
    add("the coupling matrix is not positive definite: M = " + number(v.mutual * 1e6) +
        " uH is not below sqrt(L1 L2) = " + number(std::sqrt(v.first * v.second) * 1e6) +
        " uH; check the units of the column and the reading");
  if (resistances && (!(v.first_resistance > 0) || !(v.second_resistance > 0)))
    add("resistances must be positive, or be left out of the whole table");
}

}  // namespace

double PairValues::coupling() const { return mutual / std::sqrt(first * second); }

TableError::TableError(std::vector<TableComplaint> list)
    : std::invalid_argument(all_of(list)), complaints(std::move(list)) {}

PositionTable::PositionTable(const std::vector<TableRow>& rows) {
  if (rows.empty()) throw TableError({{0, "the table has no rows"}});
  for (const TableRow& row : rows)
    resistances_ = resistances_ || row.values.first_resistance != 0 || row.values.second_resistance != 0;
  std::vector<TableComplaint> list;
  for (size_t i = 0; i < rows.size(); ++i) check_row(rows[i], static_cast<int>(i) + 1, resistances_, list);
  if (!list.empty()) throw TableError(std::move(list));

  std::array<std::vector<double>, 3> found;
  for (const TableRow& row : rows) {
    found[0].push_back(row.position.gap), found[1].push_back(row.position.shift),
        found[2].push_back(row.position.tilt);
  }
  for (int i = 0; i < 3; ++i) axes_[i] = axis_of(found[i]);
  nodes_.resize(axes_[0].size() * axes_[1].size() * axes_[2].size());
  std::vector<int> row_of(nodes_.size(), 0);
  for (size_t i = 0; i < rows.size(); ++i) {
    const Position& p = rows[i].position;
    const PairValues& v = rows[i].values;
    const size_t at =
        (nearest(axes_[0], p.gap) * axes_[1].size() + nearest(axes_[1], p.shift)) * axes_[2].size() +
        nearest(axes_[2], p.tilt);
    if (row_of[at] > 0)
      list.push_back(
          {static_cast<int>(i) + 1, place(p) + ": stands in row " + std::to_string(row_of[at]) + " already"});
    row_of[at] = static_cast<int>(i) + 1;
    nodes_[at] = {std::log(v.first), std::log(v.second), std::atanh(v.coupling()),
                  resistances_ ? std::log(v.first_resistance) : 0,
                  resistances_ ? std::log(v.second_resistance) : 0};
  }
  for (size_t at = 0; at < row_of.size(); ++at) {
    if (row_of[at] > 0) continue;
    const size_t tilt = at % axes_[2].size(), shift = at / axes_[2].size() % axes_[1].size();
    const Position p{axes_[0][at / axes_[2].size() / axes_[1].size()], axes_[1][shift], axes_[2][tilt]};
    list.push_back({0, "the point at " + place(p) +
                           " is missing; the rows must fill the grid of all gaps, shifts and tilts"});
  }
  if (!list.empty()) throw TableError(std::move(list));
}

PositionTable::Node PositionTable::along_gap(int gap, const Position& p) const {
  const size_t shifts = axes_[1].size(), tilts = axes_[2].size();
  const auto node = [&](size_t shift, size_t tilt) -> const Node& {
    return nodes_[(gap * shifts + shift) * tilts + tilt];
  };
  Node made;
  for (int kind = 0; kind < kinds; ++kind) {
    const auto at_shift = [&](size_t shift) {
      if (tilts == 1) return node(shift, 0)[kind];
      return cubic(axes_[2], cell(axes_[2], p.tilt), p.tilt,
                   [&](size_t tilt) { return node(shift, tilt)[kind]; });
    };
    made[kind] = shifts == 1 ? at_shift(0) : cubic(axes_[1], cell(axes_[1], p.shift), p.shift, at_shift);
  }
  return made;
}

PositionTable::Node PositionTable::interpolate(const Position& p) const {
  const std::array<double, 3> at = {p.gap, p.shift, p.tilt};
  static const char* names[] = {"gap", "shift", "tilt"};
  for (int i = 0; i < 3; ++i) {
    const double low = axes_[i].front(), high = axes_[i].back(),
                 slack = same * std::max(std::abs(low), std::abs(high));
    if (at[i] >= low - slack && at[i] <= high + slack) continue;
    const double scale = i < 2 ? 1e3 : 180 / 3.14159265358979323846;
    const char* unit = i < 2 ? " mm" : " deg";
    throw std::out_of_range(std::string(names[i]) + " " + number(at[i] * scale) + unit +
                            " lies outside the table (" + number(low * scale) + " to " +
                            number(high * scale) + unit +
                            "); add rows that cover it: nothing is extrapolated");
  }
  if (axes_[0].size() == 1) return along_gap(0, p);
  const size_t i = cell(axes_[0], p.gap), from = i == 0 ? 0 : i - 1,
               to = std::min(i + 2, axes_[0].size() - 1);
  std::array<Node, 4> columns;
  for (size_t n = from; n <= to; ++n) columns[n - from] = along_gap(static_cast<int>(n), p);
  Node made;
  for (int kind = 0; kind < kinds; ++kind)
    made[kind] = cubic(axes_[0], i, p.gap, [&](size_t n) { return columns[n - from][kind]; });
  return made;
}

PairValues PositionTable::at(const Position& position) const {
  const Node n = interpolate(position);
  PairValues v;
  v.first = std::exp(n[0]), v.second = std::exp(n[1]);
  v.mutual = std::tanh(n[2]) * std::sqrt(v.first * v.second);
  if (resistances_) v.first_resistance = std::exp(n[3]), v.second_resistance = std::exp(n[4]);
  return v;
}

std::vector<double> PositionTable::gaps_for(double coupling, double shift, double tilt) const {
  std::vector<double> found;
  const auto off = [&](double gap) { return this->coupling({gap, shift, tilt}) - coupling; };
  // A node that has the value to the last digits counts as having it, once.
  const auto settled = [](double difference) { return std::abs(difference) < 1e-14 ? 0 : difference; };
  // Within a cell the curve is monotone along the gap, so a change of sign between nodes finds every
  // crossing.
  const std::vector<double>& axis = axes_[0];
  for (size_t i = 0; i < axis.size(); ++i) {
    const double here = settled(off(axis[i]));
    if (here == 0) found.push_back(axis[i]);
    if (i + 1 == axis.size()) break;
    const double next = settled(off(axis[i + 1]));
    if (here * next >= 0) continue;
    boost::uintmax_t most = 200;
    const auto ends = boost::math::tools::toms748_solve(off, axis[i], axis[i + 1], here, next,
                                                        boost::math::tools::eps_tolerance<double>(50), most);
    found.push_back(0.5 * (ends.first + ends.second));
  }
  return found;
}

}  // namespace couplet::coil
