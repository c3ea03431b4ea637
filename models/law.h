// SPDX-License-Identifier: MIT
// The small vocabulary in which a part states its law. A part writes elements onto a Sheet; it knows nothing of
// solvers. Everything is SI: volts, amperes, ohms, farads, henries, seconds.
//
// Signs: the current of an element from node `from` to node `to` is positive when it leaves `from` through the
// element; it absorbs the power (v_from - v_to) * i. An Emf raises `from` above `to` by its value.
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace couplet {

/// Index into Sheet::nodes; 0 is always the reference node "gnd".
using Node = int;

/// An affine form: constant + sum of k (v_plus - v_minus) + sum of k * coil current + sum of k * waveform value.
struct Form {
  struct Volt {
    Node plus, minus;
    double k;
  };
  struct Term {
    int index;  // into Sheet::coils (currents) or Sheet::waveforms (waves)
    double k;
  };
  double constant = 0;
  std::vector<Volt> volts;
  std::vector<Term> currents;
  std::vector<Term> waves;

  Form& add(double value) { return constant += value, *this; }
  Form& volt(Node plus, Node minus, double k = 1) { return volts.push_back({plus, minus, k}), *this; }
  Form& current(int coil, double k = 1) { return currents.push_back({coil, k}), *this; }
  Form& wave(int waveform, double k = 1) { return waves.push_back({waveform, k}), *this; }
  /// this + k * other
  Form& plus(const Form& other, double k = 1);
};

/// A value over time that does not depend on the circuit: a broken line (held after its last point, or repeated with
/// `period`), or offset + amplitude * sin(2 pi frequency t + phase). Two points at one time make a jump.
struct Waveform {
  struct Point {
    double time, value;
  };
  std::vector<Point> points;  // broken line where not empty; first point's value holds before it
  double period = 0;          // of the broken line; 0: not repeated
  double offset = 0, amplitude = 0, frequency = 0, phase = 0;  // sine where `points` is empty
};

/// A switch command: on during [(n + phase) T + dead, (n + phase + duty) T) for every whole n (T = 1/frequency, also
/// negative n so that time zero may fall inside an on interval).
struct Command {
  double frequency = 0, duty = 0, phase = 0, dead = 0;
};

/// One bit of a piecewise-linear element. The bit is set while `form` is positive. With hysteresis the bit, once set,
/// is kept until `held` falls through zero (held > form where form = 0). A commanded bit follows a Command instead.
struct Condition {
  Form form;
  bool hysteresis = false;
  Form held;         // used while the bit is set, when hysteresis
  bool start = false;  // the bit before the first instant, when hysteresis leaves it open
  int command = -1;  // index into Sheet::commands, or -1
};

/// A region of a piecewise-linear element: holds while (bits & mask) == value. The cells of an element cover all
/// combinations of bits and do not overlap. `state` is what a person reads ("off", "conducts", "saturated").
struct Cell {
  std::string state;
  std::uint32_t mask = 0, value = 0;
  Form current;  // from `from` to `to`, amperes
};

/// What an element's power is counted as.
enum class Role { loss, load, source };

/// A current from node to node that is affine in voltages, coil currents and waveforms, cell by cell. A resistor is
/// one of a single cell. Where part of the law is an electromotive force (a battery's, a supply's), `emf` says which:
/// emf * current is then counted as delivered (positive out of the element when the current flows from `to` to
/// `from` inside it, i.e. the delivered power is -emf * current).
struct Branch {
  int part = -1;  // index into Sheet::parts
  std::string name;
  Node from = 0, to = 0;
  std::vector<Condition> conditions;
  std::vector<Cell> cells;
  bool has_emf = false;
  Form emf;
};

struct Capacitor {
  int part = -1;
  std::string name;
  Node from = 0, to = 0;
  double capacitance = 0, start = 0;  // farads, volts
};

/// v_from - v_to = inductance di/dt + resistance i
struct Coil {
  int part = -1;
  std::string name;
  Node from = 0, to = 0;
  double inductance = 0, resistance = 0, start = 0;  // henries, ohms, amperes
};

struct Coupling {
  int first = -1, second = -1;  // indices into Sheet::coils
  double mutual = 0;            // henries
};

/// v_from - v_to = value, with a current unknown of its own (ideal: no resistance).
struct Emf {
  int part = -1;
  std::string name;
  Node from = 0, to = 0;
  Form value;
};

/// Ideal: v(a) - v(b) = ratio (v(c) - v(d)); current into a times ratio leaves at c.
struct Transformer {
  int part = -1;
  std::string name;
  Node a = 0, b = 0, c = 0, d = 0;
  double ratio = 1;
};

/// A name that figures are kept under: a part of the netlist, or a piece of a block ("bridge.upper_left").
/// Voltage and current of the part, as figures and ratings see them, are v(plus) - v(minus) and the current that
/// enters at `plus` (through all its elements).
struct SheetPart {
  std::string name, kind;
  Node plus = 0, minus = 0;
  Role role = Role::loss;
  double dropout = 0, output_voltage = 0;  // regulators: for the headroom figure
  Node input = 0, output = 0, common = 0;  // regulators
};

/// All elements of a circuit, and the names that people gave to things.
class Sheet {
 public:
  Sheet() : nodes{"gnd"} {}

  std::vector<std::string> nodes;
  std::vector<SheetPart> parts;
  std::vector<Branch> branches;
  std::vector<Capacitor> capacitors;
  std::vector<Coil> coils;
  std::vector<Coupling> couplings;
  std::vector<Emf> emfs;
  std::vector<Transformer> transformers;
  std::vector<Waveform> waveforms;
  std::vector<Command> commands;
  /// Watched for crossings of zero without any law depending on them (sections, thresholds of figures).
  struct Probe {
    std::string name;
    Form form;
  };
  std::vector<Probe> probes;

  /// The node of that name, made where it is new.
  Node node(const std::string& name);
  /// A further node inside part `part`, called "PART.name".
  Node inner(int part, const std::string& name);
  /// Opens a part's account and returns its index.
  int part(const std::string& name, const std::string& kind, Node plus, Node minus, Role role = Role::loss);
  int waveform(Waveform w) { return waveforms.push_back(std::move(w)), static_cast<int>(waveforms.size()) - 1; }
  int command(Command c) { return commands.push_back(c), static_cast<int>(commands.size()) - 1; }

  /// Linear resistor, ohms (> 0).
  void resistor(int part, Node from, Node to, double ohms);
  void capacitor(int part, Node from, Node to, double farads, double volts_at_start);
  /// Returns the coil's index.
  int coil(int part, Node from, Node to, double henries, double ohms, double amperes_at_start);
  Branch& branch(int part, const std::string& name, Node from, Node to);
  void emf(int part, Node from, Node to, Form value);
};

}  // namespace couplet
