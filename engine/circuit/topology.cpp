// SPDX-License-Identifier: MIT
// Reduction of the circuit in one set of cells to dx/dt = A x, w = C x. Done in long double: an open switch (gigaohms)
// beside a closed one (milliohms) costs digits that double precision does not have to spare.
#include <fmt/format.h>

#include <cmath>

#include "engine/circuit/circuit.h"

namespace couplet {

const Topology& Circuit::topology(const std::vector<std::uint8_t>& cells) const {
  const std::string_view key(reinterpret_cast<const char*>(cells.data()), cells.size());
  const auto found = topologies_.find(key);
  if (found != topologies_.end()) return *found->second;
  auto made = std::make_unique<Topology>();
  made->id = static_cast<int>(order_.size());
  made->cells = cells;
  reduce(*made);
  order_.push_back(made.get());
  return *topologies_.emplace(std::string(key), std::move(made)).first->second;
}

void Circuit::reduce(Topology& topology) const {
  Matrix G = fixed_, H = fixed_inputs_;
  for (std::size_t b = 0; b < sheet_.branches.size(); ++b) {
    const auto& branch = sheet_.branches[b];
    add_stamps(branch.cells[topology.cells[b]].current, branch.from, branch.to, G, H);
  }
  // z = P a + N b. Rows N': 0 = Kba a + Kbb b + Hb u; rows P': M da/dt = -(Kaa a + Kab b + Ha u).
  const Matrix& P = projection_;
  const Matrix& N = kernel_;
  const Matrix GP = G * P, GN = G * N;
  const Matrix Kbb = N.transpose() * GN;
  Matrix from_a = Matrix::Zero(N.cols(), states_), from_u = Matrix::Zero(N.cols(), inputs_);  // b = from_a a + from_u u
  if (N.cols() > 0) {
    Eigen::FullPivLU<Matrix> lu(Kbb);
    lu.setThreshold(1e-19L);
    if (!lu.isInvertible()) explain_singular(Kbb);
    from_a = -lu.solve(N.transpose() * GP);
    from_u = -lu.solve(N.transpose() * H);
  }
  const Matrix Paa = -(P.transpose() * (GP + GN * from_a)), Pau = -(P.transpose() * (H + GN * from_u));
  Matrix A = Matrix::Zero(size(), size());
  A.topLeftCorner(states_, states_) = inverse_energy_.transpose() * Paa * inverse_energy_;
  A.topRightCorner(states_, inputs_) = inverse_energy_.transpose() * Pau;
  for (std::size_t w = 0; w < sheet_.waveforms.size(); ++w) {
    const int i = states_ + input_of_waveform(static_cast<int>(w));
    if (sheet_.waveforms[w].points.empty()) {
      const long double omega = 2 * static_cast<long double>(M_PIl) * sheet_.waveforms[w].frequency;
      A(i, i + 1) = omega;
      A(i + 1, i) = -omega;
    } else {
      A(i, i + 1) = 1;
    }
  }
  Matrix z = Matrix::Zero(unknowns_, size());
  z.leftCols(states_) = (P + N * from_a) * inverse_energy_;
  z.rightCols(inputs_) = N * from_u;
  Matrix C = expand_.cast<long double>() * z;
  // Pieces that hang on coils only: their common voltage follows from the tree coil's own law.
  if (!tree_coils_.empty()) {
    Matrix rates = Matrix::Zero(free_coils_.size(), size());
    rates = (inverse_energy_ * A.topRows(states_)).bottomRows(free_coils_.size());
    const Matrix slopes = (inductance_ * coil_free_).cast<long double>() * rates;
    std::vector<bool> known(piece_reference_.size(), false);
    known[0] = true;
    for (std::size_t round = 0; round < tree_coils_.size(); ++round) {
      for (int t : tree_coils_) {
        const auto& coil = sheet_.coils[t];
        const int from = piece_[coil.from], to = piece_[coil.to];
        if (known[from] == known[to]) continue;
        const auto voltage = [&](Node n) -> Matrix { return n > 0 ? Matrix(C.row(n - 1)) : Matrix(Matrix::Zero(1, size())); };
        const Matrix drop = slopes.row(t) + static_cast<long double>(coil.resistance) * C.row(row_of_coil(t));
        const Matrix lift = known[to] ? Matrix(voltage(coil.to) + drop - voltage(coil.from))
                                      : Matrix(voltage(coil.from) - drop - voltage(coil.to));
        const int piece = known[to] ? from : to;
        for (int n = 1; n <= nodes_; ++n) {
          if (piece_[n] == piece) C.row(n - 1) += lift;
        }
        known[piece] = true;
      }
    }
  }
  topology.A = A.cast<double>();
  topology.C = C.cast<double>();
  for (std::size_t b = 0; b < sheet_.branches.size(); ++b) {
    const Cell& cell = sheet_.branches[b].cells[topology.cells[b]];
    for (std::size_t c = 0; c < sheet_.branches[b].conditions.size(); ++c) {
      if (!(cell.mask >> c & 1U) || sheet_.branches[b].conditions[c].command >= 0) continue;
      topology.watches.push_back({static_cast<int>(b), static_cast<int>(c), (cell.value >> c & 1U) != 0});
    }
  }
  for (std::size_t p = 0; p < sheet_.probes.size(); ++p) topology.watches.push_back({-1, static_cast<int>(p), false});
  topology.watch_rows.resize(static_cast<int>(topology.watches.size()), size());
  for (std::size_t i = 0; i < topology.watches.size(); ++i) {
    const Watch& watch = topology.watches[i];
    const Form* form = nullptr;
    if (watch.branch < 0) {
      form = &sheet_.probes[watch.condition].form;
    } else {
      const Condition& condition = sheet_.branches[watch.branch].conditions[watch.condition];
      form = condition.hysteresis && watch.bit ? &condition.held : &condition.form;
    }
    topology.watch_rows.row(static_cast<int>(i)) = row_over_state(topology, *form);
  }
}

void Circuit::explain_singular(const Matrix& algebraic) const {
  // The null vector tells which nodes nothing holds.
  Eigen::FullPivLU<Matrix> lu(algebraic);
  lu.setThreshold(1e-19L);
  const Matrix null = kernel_ * lu.kernel().col(0);
  const long double largest = null.cwiseAbs().maxCoeff();
  std::string names;
  for (int n = 0; n < nodes_; ++n) {
    if (std::abs(null(n, 0)) > largest * 1e-6L) names += (names.empty() ? "" : ", ") + sheet_.nodes[n + 1];
  }
  if (names.empty()) names = "the sources";
  throw CircuitError(fmt::format("nothing holds the voltage of {} when every part around it carries a fixed current or none; add a "
                                 "resistor or a small capacitor there",
                                 names));
}

}  // namespace couplet
