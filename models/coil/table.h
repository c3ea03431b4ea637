// SPDX-License-Identifier: MIT
// Two coils whose values change with their position: a table over gap, shift and tilt, from a bench or from
// geometry, interpolated so that the coupling matrix stays positive definite between the points.
//
// What is interpolated are ln L1, ln L2, artanh(M/sqrt(L1 L2)), ln R1 and ln R2: whatever values these take,
// both inductances and resistances are positive and |k| < 1, by the parametrisation and not by luck of the
// curve. Between the points runs a piecewise cubic without overshoot (F. N. Fritsch, J. Butland, SIAM J. Sci.
// Stat. Comput. 5 (1984) 300): first along tilt, then shift, then gap.
#pragma once

#include <array>
#include <stdexcept>
#include <string>
#include <vector>

namespace couplet::coil {

struct Position {
  double gap = 0, shift = 0, tilt = 0;  // m, m, rad
};

struct PairValues {
  double first = 0, second = 0;                        // L1, L2, H
  double mutual = 0;                                   // M, H; negative where the coils oppose
  double first_resistance = 0, second_resistance = 0;  // ohm; all zero where the table has none

  double coupling() const;
};

struct TableRow {
  Position position;
  PairValues values;
};

/// What is wrong with a row of the table (counted from 1; 0: with the table as a whole), and what to do.
struct TableComplaint {
  int row = 0;
  std::string text;
};

class TableError : public std::invalid_argument {
 public:
  explicit TableError(std::vector<TableComplaint> list);
  std::vector<TableComplaint> complaints;
};

class PositionTable {
 public:
  /// Rows in any order; together they must fill a grid of gaps, shifts and tilts (any of which may have one
  /// value). Throws TableError with all complaints: missing or double points, values that are not positive,
  /// |k| >= 1.
  explicit PositionTable(const std::vector<TableRow>& rows);

  /// Throws std::out_of_range outside the table, saying which way: nothing is extrapolated.
  PairValues at(const Position& position) const;
  double coupling(const Position& position) const { return at(position).coupling(); }
  /// Every gap at which the coupling factor has this value; ascending, empty where there is none.
  std::vector<double> gaps_for(double coupling, double shift = 0, double tilt = 0) const;

  const std::vector<double>& gaps() const { return axes_[0]; }
  const std::vector<double>& shifts() const { return axes_[1]; }
  const std::vector<double>& tilts() const { return axes_[2]; }

 private:
  static constexpr int kinds = 5;
  using Node = std::array<double, kinds>;  // ln L1, ln L2, artanh k, ln R1, ln R2
  Node along_gap(int gap, const Position& position) const;
  Node interpolate(const Position& position) const;
  std::array<std::vector<double>, 3> axes_;
  std::vector<Node> nodes_;  // gap slowest, tilt fastest
  bool resistances_ = false;
};

}  // namespace couplet::coil
