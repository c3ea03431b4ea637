// SPDX-License-Identifier: MIT
#include "engine/circuit/circuit.h"

#include <fmt/format.h>

#include <algorithm>
#include <numeric>

namespace couplet {
namespace {

/// Sets that grow together; the smallest member stands for its set.
class Groups {
 public:
  explicit Groups(int n) : parent_(n) { std::iota(parent_.begin(), parent_.end(), 0); }
  int find(int i) {
    while (parent_[i] != i) i = parent_[i] = parent_[parent_[i]];
    return i;
  }
  /// False where both were in one set already.
  bool join(int i, int j) {
    i = find(i), j = find(j);
    if (i == j) return false;
    parent_[std::max(i, j)] = std::min(i, j);
    return true;
  }

 private:
  std::vector<int> parent_;
};

std::string list_names(const std::vector<std::string>& names) {
  std::string text;
  for (std::size_t i = 0; i < names.size(); ++i) text += (i ? ", " : "") + names[i];
  return text;
}

}  // namespace

Circuit::Circuit(Sheet sheet) : sheet_(std::move(sheet)) {
  nodes_ = static_cast<int>(sheet_.nodes.size()) - 1;
  inputs_ = 1 + 2 * static_cast<int>(sheet_.waveforms.size());
  outputs_ = nodes_ + static_cast<int>(sheet_.coils.size() + sheet_.emfs.size() + sheet_.transformers.size());
  group_nodes();
  check_structure();
  assemble_fixed();
}

void Circuit::group_nodes() {
  Groups pieces(nodes_ + 1);
  for (const auto& b : sheet_.branches) pieces.join(b.from, b.to);
  for (const auto& c : sheet_.capacitors) pieces.join(c.from, c.to);
  for (const auto& e : sheet_.emfs) pieces.join(e.from, e.to);
  for (const auto& t : sheet_.transformers) pieces.join(t.a, t.b), pieces.join(t.c, t.d);
  piece_.assign(nodes_ + 1, 0);
  std::vector<int> of_root(nodes_ + 1, -1);
  for (int n = 0; n <= nodes_; ++n) {
    const int root = pieces.find(n);
    if (of_root[root] < 0) of_root[root] = static_cast<int>(piece_reference_.size()), piece_reference_.push_back(root);
    piece_[n] = of_root[root];
  }
  // A spanning tree of coils over the pieces: one tree coil brings in one piece.
  Groups joined(static_cast<int>(piece_reference_.size()));
  for (int c = 0; c < static_cast<int>(sheet_.coils.size()); ++c) {
    const auto& coil = sheet_.coils[c];
    if (joined.join(piece_[coil.from], piece_[coil.to])) {
      tree_coils_.push_back(c);
    } else {
      free_coils_.push_back(c);
    }
  }
  std::vector<std::string> floating;
  for (int n = 1; n <= nodes_; ++n) {
    if (joined.find(piece_[n]) != 0) floating.push_back(sheet_.nodes[n]);
  }
  if (!floating.empty()) {
    throw CircuitError(fmt::format("nothing ties {} to gnd, so their voltage is undetermined; connect one of them to gnd "
                                   "(coupled coils and transformers carry no dc reference)",
                                   list_names(floating)));
  }
}

void Circuit::check_structure() const {
  // Emfs and capacitors: a capacitor whose voltage is forced, or a loop of emfs.
  Groups emfs(nodes_ + 1);
  for (const auto& e : sheet_.emfs) {
    if (!emfs.join(e.from, e.to)) {
      throw CircuitError(fmt::format("{} closes a loop of ideal voltage sources; give one of them a series resistance",
                                     sheet_.parts[e.part].name));
    }
  }
  Groups capacitors(nodes_ + 1);
  for (const auto& c : sheet_.capacitors) capacitors.join(c.from, c.to);
  for (const auto& e : sheet_.emfs) {
    if (!capacitors.join(e.from, e.to)) {
      std::vector<std::string> names;
      for (const auto& c : sheet_.capacitors) {
        if (capacitors.find(c.from) == capacitors.find(e.from)) names.push_back(sheet_.parts[c.part].name);
      }
      throw CircuitError(fmt::format("{} (an ideal source) closes a loop with the capacitors {}, so their voltage would have "
                                     "to jump; give the source or a capacitor a series resistance",
                                     sheet_.parts[e.part].name, list_names(names)));
    }
  }
  // Laws that look across a gap bridged by coils only would feed on a voltage that follows from di/dt.
  for (const auto& b : sheet_.branches) {
    for (const auto& cell : b.cells) {
      for (const auto& v : cell.current.volts) {
        if (piece_[v.plus] != piece_[v.minus]) {
          throw CircuitError(fmt::format("{} is controlled by the voltage between {} and {}, which only coils connect; tie them "
                                         "with a resistor",
                                         b.name, sheet_.nodes[v.plus], sheet_.nodes[v.minus]));
        }
      }
    }
  }
}

double Circuit::constant_part(const Form& form) const {
  double value = form.constant;
  for (const auto& w : form.waves) value += w.k * sheet_.waveforms[w.index].offset;
  return value;
}

void Circuit::add_stamps(const Form& current, Node from, Node to, Matrix& G, Matrix& H) const {
  const auto add = [&](int column, double k, Matrix& target) {
    if (from > 0) target(from - 1, column) += k;
    if (to > 0) target(to - 1, column) -= k;
  };
  for (const auto& v : current.volts) {
    if (v.plus > 0) add(v.plus - 1, v.k, G);
    if (v.minus > 0) add(v.minus - 1, -v.k, G);
  }
  for (const auto& c : current.currents) {
    for (int f = 0; f < static_cast<int>(free_coils_.size()); ++f) {
      if (coil_free_(c.index, f) != 0) add(nodes_ + f, c.k * coil_free_(c.index, f), G);
    }
  }
  for (const auto& w : current.waves) add(input_of_waveform(w.index), w.k, H);
  if (const double c = constant_part(current); c != 0) add(0, c, H);
}

void Circuit::assemble_fixed() {
  const int coils = static_cast<int>(sheet_.coils.size()), free = static_cast<int>(free_coils_.size());
  const int emfs = static_cast<int>(sheet_.emfs.size()), transformers = static_cast<int>(sheet_.transformers.size());
  unknowns_ = nodes_ + free + emfs + transformers;

  // All coil currents from the free ones: at every piece (but that of gnd) the coil currents sum to zero.
  const int pieces = static_cast<int>(piece_reference_.size()) - 1;
  Eigen::MatrixXd meets = Eigen::MatrixXd::Zero(pieces, coils);
  for (int c = 0; c < coils; ++c) {
    if (const int p = piece_[sheet_.coils[c].from]; p > 0) meets(p - 1, c) += 1;
    if (const int p = piece_[sheet_.coils[c].to]; p > 0) meets(p - 1, c) -= 1;
  }
  coil_free_ = Eigen::MatrixXd::Zero(coils, free);
  for (int f = 0; f < free; ++f) coil_free_(free_coils_[f], f) = 1;
  if (pieces > 0) {
    Eigen::MatrixXd tree(pieces, pieces), rest(pieces, free);
    for (int t = 0; t < pieces; ++t) tree.col(t) = meets.col(tree_coils_[t]);
    for (int f = 0; f < free; ++f) rest.col(f) = meets.col(free_coils_[f]);
    const Eigen::MatrixXd follow = -tree.fullPivLu().solve(rest);
    for (int t = 0; t < pieces; ++t) {
      for (int f = 0; f < free; ++f) coil_free_(tree_coils_[t], f) = std::round(follow(t, f));
    }
  }
  inductance_ = Eigen::MatrixXd::Zero(coils, coils);
  for (int c = 0; c < coils; ++c) inductance_(c, c) = sheet_.coils[c].inductance;
  for (const auto& m : sheet_.couplings) {
    inductance_(m.first, m.second) += m.mutual;
    inductance_(m.second, m.first) += m.mutual;
  }

  expand_ = Eigen::MatrixXd::Zero(outputs_, unknowns_);
  for (int n = 0; n < nodes_; ++n) expand_(n, n) = 1, unknown_rows_.push_back(n);
  expand_.block(nodes_, nodes_, coils, free) = coil_free_;
  for (int f = 0; f < free; ++f) unknown_rows_.push_back(row_of_coil(free_coils_[f]));
  for (int e = 0; e < emfs + transformers; ++e) {
    expand_(nodes_ + coils + e, nodes_ + free + e) = 1;
    unknown_rows_.push_back(nodes_ + coils + e);
  }

  fixed_ = Matrix::Zero(unknowns_, unknowns_);
  fixed_inputs_ = Matrix::Zero(unknowns_, inputs_);
  incidence_ = Eigen::MatrixXd::Zero(nodes_, static_cast<int>(sheet_.capacitors.size()));
  Matrix capacitance = Matrix::Zero(nodes_, nodes_);
  for (int k = 0; k < static_cast<int>(sheet_.capacitors.size()); ++k) {
    const auto& c = sheet_.capacitors[k];
    if (c.from > 0) incidence_(c.from - 1, k) += 1;
    if (c.to > 0) incidence_(c.to - 1, k) -= 1;
    const Matrix column = incidence_.col(k).cast<long double>();
    capacitance += static_cast<long double>(c.capacitance) * column * column.transpose();
  }
  Matrix legs = Matrix::Zero(nodes_, coils), losses = Matrix::Zero(coils, coils);
  for (int c = 0; c < coils; ++c) {
    if (sheet_.coils[c].from > 0) legs(sheet_.coils[c].from - 1, c) += 1;
    if (sheet_.coils[c].to > 0) legs(sheet_.coils[c].to - 1, c) -= 1;
    losses(c, c) = sheet_.coils[c].resistance;
  }
  const Matrix Q = coil_free_.cast<long double>(), L = inductance_.cast<long double>();
  fixed_.block(0, nodes_, nodes_, free) = legs * Q;
  fixed_.block(nodes_, 0, free, nodes_) = -(legs * Q).transpose();
  fixed_.block(nodes_, nodes_, free, free) = Q.transpose() * losses * Q;
  for (int e = 0; e < emfs; ++e) {
    const auto& s = sheet_.emfs[e];
    const int row = nodes_ + free + e;
    for (auto [node, sign] : {std::pair{s.from, 1}, std::pair{s.to, -1}}) {
      if (node > 0) fixed_(node - 1, row) += sign, fixed_(row, node - 1) += sign;
    }
    fixed_inputs_(row, 0) -= constant_part(s.value);
    for (const auto& w : s.value.waves) fixed_inputs_(row, input_of_waveform(w.index)) -= w.k;
  }
  for (int t = 0; t < transformers; ++t) {
    const auto& s = sheet_.transformers[t];
    const int row = nodes_ + free + emfs + t;
    for (auto [node, k] : {std::pair{s.a, 1.0}, {s.b, -1.0}, {s.c, -s.ratio}, {s.d, s.ratio}}) {
      if (node > 0) fixed_(node - 1, row) += k, fixed_(row, node - 1) += k;
    }
  }

  // Energy coordinates: voltages of a spanning forest of capacitors (largest first) and currents of free coils.
  std::vector<int> by_size(sheet_.capacitors.size());
  std::iota(by_size.begin(), by_size.end(), 0);
  std::stable_sort(by_size.begin(), by_size.end(), [&](int a, int b) {
    return sheet_.capacitors[a].capacitance > sheet_.capacitors[b].capacitance;
  });
  Groups joined(nodes_ + 1);
  for (int k : by_size) {
    if (joined.join(sheet_.capacitors[k].from, sheet_.capacitors[k].to)) tree_capacitors_.push_back(k);
  }
  const int trees = static_cast<int>(tree_capacitors_.size());
  states_ = trees + free;
  projection_ = Matrix::Zero(unknowns_, states_);
  // Walk each tree outwards from its root (the smallest node): voltage of a node = that of its neighbour +- the capacitor's.
  std::vector<bool> reached(nodes_ + 1, false);
  for (int n = 0; n <= nodes_; ++n) reached[n] = joined.find(n) == n;
  for (bool more = true; more;) {
    more = false;
    for (int a = 0; a < trees; ++a) {
      const auto& c = sheet_.capacitors[tree_capacitors_[a]];
      if (reached[c.from] == reached[c.to]) continue;
      const bool outward = reached[c.to];
      const Node known = outward ? c.to : c.from, next = outward ? c.from : c.to;
      if (known > 0) projection_.row(next - 1) = projection_.row(known - 1);
      projection_(next - 1, a) += outward ? 1 : -1;
      reached[next] = more = true;
    }
  }
  for (int f = 0; f < free; ++f) projection_(nodes_ + f, trees + f) = 1;
  // Kernel: common voltage of each group joined by capacitors (gnd's and, in a piece that hangs on coils only, its
  // reference's left out), currents of emfs and transformers.
  std::vector<int> roots;
  for (int n = 1; n <= nodes_; ++n) {
    if (joined.find(n) == n && joined.find(piece_reference_[piece_[n]]) != n) roots.push_back(n);
  }
  kernel_ = Matrix::Zero(unknowns_, static_cast<int>(roots.size()) + emfs + transformers);
  for (int b = 0; b < static_cast<int>(roots.size()); ++b) {
    for (int n = 1; n <= nodes_; ++n) {
      if (joined.find(n) == roots[b]) kernel_(n - 1, b) = 1;
    }
  }
  for (int e = 0; e < emfs + transformers; ++e) kernel_(nodes_ + free + e, static_cast<int>(roots.size()) + e) = 1;

  Matrix M = Matrix::Zero(states_, states_);
  const Matrix P = projection_.topLeftCorner(nodes_, trees);
  M.topLeftCorner(trees, trees) = P.transpose() * capacitance * P;
  M.bottomRightCorner(free, free) = Q.transpose() * L * Q;
  const Eigen::LLT<Matrix> cholesky(M);
  if (states_ > 0 && cholesky.info() != Eigen::Success) {
    throw CircuitError("the inductance matrix of the coils is not positive definite; lower the coupling factors");
  }
  energy_ = states_ ? Matrix(cholesky.matrixU()) : Matrix(0, 0);
  inverse_energy_ = Matrix::Identity(states_, states_);
  if (states_) energy_.triangularView<Eigen::Upper>().solveInPlace(inverse_energy_);

  mass_ = Eigen::MatrixXd::Zero(unknowns_, unknowns_);
  mass_.topLeftCorner(nodes_, nodes_) = capacitance.cast<double>();
  mass_.block(nodes_, nodes_, free, free) = (Q.transpose() * L * Q).cast<double>();
  for (int t = 0; t < pieces; ++t) {
    // The reference node's balance of piece t+1 says nothing that the free coils do not know: the tree coil's own law instead.
    const int row = piece_reference_[t + 1] - 1;
    mass_.row(row).setZero();
    mass_.block(row, nodes_, 1, free) = inductance_.row(tree_coils_[t]) * coil_free_;
  }
}

void Circuit::conductance(const std::vector<std::uint8_t>& cells, Eigen::MatrixXd& G, Eigen::MatrixXd& H) const {
  Matrix g = fixed_, h = fixed_inputs_;
  for (std::size_t b = 0; b < sheet_.branches.size(); ++b) {
    const auto& branch = sheet_.branches[b];
    add_stamps(branch.cells[cells[b]].current, branch.from, branch.to, g, h);
  }
  G = g.cast<double>();
  H = h.cast<double>();
  for (std::size_t t = 0; t < tree_coils_.size(); ++t) {
    const int row = piece_reference_[t + 1] - 1;
    const auto& coil = sheet_.coils[tree_coils_[t]];
    G.row(row).setZero();
    H.row(row).setZero();
    G.block(row, nodes_, 1, G.cols() - nodes_).leftCols(coil_free_.cols()) = coil.resistance * coil_free_.row(tree_coils_[t]);
    if (coil.from > 0) G(row, coil.from - 1) -= 1;
    if (coil.to > 0) G(row, coil.to - 1) += 1;
  }
}

void Circuit::form_rows(const Form& form, Eigen::VectorXd& over_outputs, Eigen::VectorXd& over_inputs) const {
  over_outputs = Eigen::VectorXd::Zero(outputs_);
  over_inputs = Eigen::VectorXd::Zero(inputs_);
  for (const auto& v : form.volts) {
    if (v.plus > 0) over_outputs[v.plus - 1] += v.k;
    if (v.minus > 0) over_outputs[v.minus - 1] -= v.k;
  }
  for (const auto& c : form.currents) over_outputs[row_of_coil(c.index)] += c.k;
  over_inputs[0] = constant_part(form);
  for (const auto& w : form.waves) over_inputs[input_of_waveform(w.index)] += w.k;
}

Eigen::RowVectorXd Circuit::row_over_state(const Topology& topology, const Form& form) const {
  Eigen::VectorXd over_outputs, over_inputs;
  form_rows(form, over_outputs, over_inputs);
  Eigen::RowVectorXd row = over_outputs.transpose() * topology.C;
  row.tail(inputs_) += over_inputs.transpose();
  return row;
}

double Circuit::evaluate(const Form& form, const Eigen::VectorXd& w, const Eigen::VectorXd& u) const {
  const auto at = [&](Node n) { return n > 0 ? w[n - 1] : 0.0; };
  double value = constant_part(form) * u[0];
  for (const auto& v : form.volts) value += v.k * (at(v.plus) - at(v.minus));
  for (const auto& c : form.currents) value += c.k * w[row_of_coil(c.index)];
  for (const auto& s : form.waves) value += s.k * u[input_of_waveform(s.index)];
  return value;
}

Eigen::VectorXd Circuit::state_from_elements(const Eigen::VectorXd& volts, const Eigen::VectorXd& amperes) const {
  const int trees = static_cast<int>(tree_capacitors_.size());
  Eigen::VectorXd charges(volts.size());
  for (int k = 0; k < charges.size(); ++k) charges[k] = sheet_.capacitors[k].capacitance * volts[k];
  // Test functions of the trees see the charge of every capacitor; those of the loops the flux linkage of every coil.
  using Column = Eigen::Matrix<long double, Eigen::Dynamic, 1>;
  Column right(states_);
  right.head(trees) = projection_.topLeftCorner(nodes_, trees).transpose() * (incidence_ * charges).cast<long double>();
  right.tail(states_ - trees) = (coil_free_.transpose() * (inductance_ * amperes)).cast<long double>();
  // M a = right and xi = R a with M = R'R: xi = R'^-1 right.
  const Column xi = inverse_energy_.transpose() * right;
  return xi.cast<double>();
}

Eigen::VectorXd Circuit::start_state() const {
  Eigen::VectorXd volts(sheet_.capacitors.size()), amperes(sheet_.coils.size());
  for (int k = 0; k < volts.size(); ++k) volts[k] = sheet_.capacitors[k].start;
  for (int k = 0; k < amperes.size(); ++k) amperes[k] = sheet_.coils[k].start;
  return state_from_elements(volts, amperes);
}

Eigen::VectorXd Circuit::state_from_outputs(const Eigen::VectorXd& w) const {
  return state_from_elements(incidence_.transpose() * w.head(nodes_), w.segment(nodes_, sheet_.coils.size()));
}

Eigen::VectorXd Circuit::carry_over(const Circuit& before, const Eigen::VectorXd& w) const {
  // Charge = old capacitance x old voltage, seen by the new test functions; likewise flux linkage.
  Eigen::VectorXd charges = before.incidence_.transpose() * w.head(nodes_);
  for (int k = 0; k < charges.size(); ++k) charges[k] *= before.sheet_.capacitors[k].capacitance;
  const Eigen::VectorXd flux = before.inductance_ * w.segment(nodes_, sheet_.coils.size());
  const int trees = static_cast<int>(tree_capacitors_.size());
  using Column = Eigen::Matrix<long double, Eigen::Dynamic, 1>;
  Column right(states_);
  right.head(trees) = projection_.topLeftCorner(nodes_, trees).transpose() * (incidence_ * charges).cast<long double>();
  right.tail(states_ - trees) = (coil_free_.transpose() * flux).cast<long double>();
  const Column xi = inverse_energy_.transpose() * right;
  return xi.cast<double>();
}

int Circuit::match_cell(const Branch& branch, std::uint32_t bits) {
  for (std::size_t c = 0; c < branch.cells.size(); ++c) {
    if ((bits & branch.cells[c].mask) == branch.cells[c].value) return static_cast<int>(c);
  }
  throw std::logic_error("the cells of " + branch.name + " do not cover every combination of its conditions");
}

std::string Circuit::output_name(int row) const {
  const int coils = static_cast<int>(sheet_.coils.size()), emfs = static_cast<int>(sheet_.emfs.size());
  if (row < nodes_) return "voltage of " + sheet_.nodes[row + 1];
  row -= nodes_;
  if (row < coils) return "current of " + sheet_.coils[row].name;
  row -= coils;
  if (row < emfs) return "current of " + sheet_.parts[sheet_.emfs[row].part].name;
  return "current of " + sheet_.parts[sheet_.transformers[row - emfs].part].name;
}

}  // namespace couplet
