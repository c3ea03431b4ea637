// SPDX-License-Identifier: MIT
// A circuit: the modified nodal analysis of a sheet, E dz/dt + G(r) z + H(r) u = 0, where r is the cell of each branch
// and u are the inputs, and its reduction in one set of cells (a Topology).
//
// Unknowns z: node voltages (all but gnd), currents of the free coils, currents of emfs, currents of transformers.
// Coils that are the only connection between two pieces of the circuit carry currents that sum to zero there; the
// currents of some coils then follow from those of the others (the free ones), so that the system has index 1.
// Outputs w: node voltages (all but gnd), currents of all coils, of emfs, of transformers.
// Inputs u: u[0] = 1; for each waveform two more: value and slope (broken line) or sine and cosine.
// States x = [xi; u]: xi are energy coordinates, so that the energy stored is |xi|^2 / 2 (unit: square root of joule).
#pragma once

#include <Eigen/Dense>
#include <cstdint>
#include <memory>
#include <stdexcept>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "models/law.h"

namespace couplet {

/// The circuit cannot be solved as it stands: the text names parts or nodes and the cure. Exit status 2.
class CircuitError : public std::runtime_error {
 public:
  explicit CircuitError(const std::string& text) : std::runtime_error(text) {}
};

/// A condition that is watched in a topology, or a probe.
struct Watch {
  int branch = -1, condition = -1;  // branch -1: a probe, `condition` is its index
  bool bit = false;                 // as it stands in this topology (probes: meaningless, kept by the march)
};

/// The circuit in one set of cells: dx/dt = A x, w = C x.
struct Topology {
  int id = 0;
  std::vector<std::uint8_t> cells;  // cell of each branch
  Eigen::MatrixXd A;                // (states+inputs) square
  Eigen::MatrixXd C;                // outputs x (states+inputs)
  std::vector<Watch> watches;       // conditions first, in order of branches; then all probes
  Eigen::MatrixXd watch_rows;       // watches x (states+inputs); a condition's row is positive where its form is
};

class Circuit {
 public:
  /// Throws CircuitError (floating nodes, sources that fight capacitors, ...), all by name.
  explicit Circuit(Sheet sheet);

  const Sheet& sheet() const { return sheet_; }
  int states() const { return states_; }
  int inputs() const { return inputs_; }
  int size() const { return states_ + inputs_; }
  int outputs() const { return outputs_; }
  int unknowns() const { return unknowns_; }

  /// Row of an output in w; node 0 has none (-1).
  int row_of_node(Node node) const { return node - 1; }
  int row_of_coil(int coil) const { return nodes_ + coil; }
  int row_of_emf(int emf) const { return nodes_ + static_cast<int>(sheet_.coils.size()) + emf; }
  int row_of_transformer(int t) const { return row_of_emf(static_cast<int>(sheet_.emfs.size())) + t; }
  /// First input of a waveform (value or sine; the next one is slope or cosine).
  int input_of_waveform(int waveform) const { return 1 + 2 * waveform; }

  /// The topology of those cells; built at the first call, then looked up. Not safe from two threads.
  const Topology& topology(const std::vector<std::uint8_t>& cells) const;
  int topologies_built() const { return static_cast<int>(order_.size()); }
  const Topology& topology_by_id(int id) const { return *order_[id]; }

  /// A form as a row over w and a row over u: value = over_outputs . w + over_inputs . u
  void form_rows(const Form& form, Eigen::VectorXd& over_outputs, Eigen::VectorXd& over_inputs) const;
  /// The same over x in a topology.
  Eigen::RowVectorXd row_over_state(const Topology& topology, const Form& form) const;
  double evaluate(const Form& form, const Eigen::VectorXd& w, const Eigen::VectorXd& u) const;

  /// xi from capacitor voltages and coil currents given element by element; where they contradict each other, charge
  /// and flux linkage are conserved.
  Eigen::VectorXd state_from_elements(const Eigen::VectorXd& capacitor_volts, const Eigen::VectorXd& coil_amperes) const;
  /// xi of the netlist's start values.
  Eigen::VectorXd start_state() const;
  /// xi of this circuit from the outputs w of another of the same structure and other values (a scheduled change):
  /// charges and flux linkages carry over.
  Eigen::VectorXd carry_over(const Circuit& before, const Eigen::VectorXd& w) const;
  /// xi here -> xi of `reference`, a circuit of the same structure with other values: equal voltages and currents.
  Eigen::MatrixXd into(const Circuit& reference) const { return (reference.energy_ * inverse_energy_).cast<double>(); }
  /// Inputs and their slopes at time t, just after any jump at t.
  Eigen::VectorXd inputs_at(double t) const;
  /// The next time after t at which an input has a corner, or infinity.
  double next_corner(double t) const;
  /// The bit of a command just after time t, and the next time after t at which it changes.
  bool command_bit(int command, double t) const;
  double next_toggle(int command, double t) const;

  /// The raw system for an independent march: mass(), and conductance(cells) with its columns for u.
  const Eigen::MatrixXd& mass() const { return mass_; }
  void conductance(const std::vector<std::uint8_t>& cells, Eigen::MatrixXd& G, Eigen::MatrixXd& H) const;
  /// Rows of the unknowns z within w (z is a part of w), and w from z.
  const std::vector<int>& unknown_rows() const { return unknown_rows_; }
  Eigen::VectorXd outputs_from_unknowns(const Eigen::VectorXd& z) const { return expand_ * z; }
  /// xi from the outputs (their capacitor voltages and coil currents).
  Eigen::VectorXd state_from_outputs(const Eigen::VectorXd& w) const;

  /// The cell whose bits match; throws std::logic_error where a law's cells do not cover.
  static int match_cell(const Branch& branch, std::uint32_t bits);
  /// "voltage of rail", "current of dock_coil"
  std::string output_name(int row) const;

 private:
  using Matrix = Eigen::Matrix<long double, Eigen::Dynamic, Eigen::Dynamic>;
  void group_nodes();        // pieces joined by capacitors, by coils only; free coils
  void check_structure() const;
  void assemble_fixed();     // mass, incidences, energy coordinates
  void reduce(Topology& topology) const;
  double constant_part(const Form& form) const;  // with the offsets of its sine waveforms
  void add_stamps(const Form& current, Node from, Node to, Matrix& G, Matrix& H) const;
  [[noreturn]] void explain_singular(const Matrix& algebraic) const;

  Sheet sheet_;
  int nodes_ = 0, states_ = 0, inputs_ = 0, outputs_ = 0, unknowns_ = 0;
  std::vector<int> tree_capacitors_, free_coils_, tree_coils_;
  std::vector<int> piece_;                 // of each node (with gnd): piece joined by anything but coils
  std::vector<int> piece_reference_;       // node of each piece; piece of gnd: 0
  Eigen::MatrixXd expand_;                 // outputs x unknowns
  std::vector<int> unknown_rows_;
  Eigen::MatrixXd mass_;                   // unknowns square
  Matrix fixed_;                           // the part of G that no cell changes
  Matrix fixed_inputs_;                    // the part of H that no cell changes
  Matrix projection_;                      // z = projection_ * a + kernel_ * b (+ common voltages of coil-only pieces)
  Matrix kernel_;
  Matrix inverse_energy_;                  // a = inverse_energy_ * xi
  Matrix energy_;                          // xi = energy_ * a
  Eigen::MatrixXd incidence_;              // nodes x capacitors
  Eigen::MatrixXd coil_free_;              // coils x free coils: all coil currents from the free ones
  Eigen::MatrixXd inductance_;             // coils x coils

  struct Hash {
    using is_transparent = void;
    std::size_t operator()(std::string_view s) const { return std::hash<std::string_view>{}(s); }
  };
  mutable std::unordered_map<std::string, std::unique_ptr<Topology>, Hash, std::equal_to<>> topologies_;
  mutable std::vector<Topology*> order_;
};

}  // namespace couplet
