// SPDX-License-Identifier: MIT
// A march takes a circuit from a state and a time to a later time, and tells observers what happens.
//
//   decide the cells of all branches together, so that every watched condition holds      (state x at time t)
//   repeat until the end time:
//     apply what is due at t from outside: corners of waveforms, commanded bits; decide the cells again
//     run smoothly, x' = A x, to the nearest of: the next corner or command, the end time, the first event
//       observers see each piece as a Span (x0 at its start, x1 at its end, exact anywhere between)
//     at an event flip the bits concerned, decide the cells again at the same x             (x does not jump)
//       observers see the Event
//
// Event. Let g(t) be the form of a watched condition (or probe) and b its bit, s = +1 where b is set, -1 where not.
// On the half-open span (t0, t1] the event is the first t with s g(t) = 0 at which s g leaves for negative values.
//   - s g = 0 at t0 does not count until s g has moved away; where it moves to the negative side at once, the bit was
//     decided at t0, not by an event;
//   - s g = 0 at t1 counts once, in this span;
//   - a guard that touches zero and returns is no event;
//   - several conditions at zero at one instant (within round-off of each form's terms) flip together;
//   - events closer than the time's round-off are handled one after the other at the same time; where more than
//     1,000 follow one another without time passing, the march ends with Reason::events_pile_up and names the parts.
// Detection, location and the flip use one number: the guard's row times the state.
//
// After a failure everything up to the failing instant has been observed and `state` stands there.
#pragma once

#include <limits>
#include <memory>
#include <string>
#include <vector>

#include "engine/circuit/circuit.h"

namespace couplet {

/// Where a march stands. `x` = [energy coordinates; inputs].
struct MarchState {
  double time = 0;                   // s
  Eigen::VectorXd x;
  std::vector<std::uint32_t> bits;   // of each branch
  std::vector<std::uint8_t> cells;   // of each branch
  std::vector<char> probe_bits;      // of each probe
};

/// States between the ends of a span.
class Interpolant {
 public:
  virtual ~Interpolant() = default;
  /// x at `tau` seconds after the span's start.
  virtual void at(double tau, double* x) const = 0;
};

/// A piece of smooth running in one topology.
struct Span {
  const Circuit* circuit;
  const Topology* topology;
  double start, duration;  // s
  const double* x0;        // circuit->size() values
  const double* x1;
  const Interpolant* between;
};

struct Event {
  enum class Kind { region, probe, command, corner };
  Kind kind;
  double time;
  int branch = -1, condition = -1;  // region, command; probe: condition is the probe's index
  bool bit = false;                 // after the event
  const Topology* after = nullptr;
  const double* x = nullptr;
};

class Observer {
 public:
  virtual ~Observer() = default;
  virtual void span(const Span&) {}
  virtual void event(const Event&) {}
  /// Asked after each event; true ends the march there.
  virtual bool enough() const { return false; }
};

struct MarchReport {
  enum class Reason { not_run, end_time, observer, no_consistent_cells, events_pile_up, integrator };
  Reason reason = Reason::not_run;
  std::string sentence = "not run";
  long steps = 0, refused = 0, events = 0, commands = 0, corners = 0;
  int topologies = 0;               // met so far by this march
  double seconds = 0, seconds_building = 0;  // wall time; building: topologies and their ladders
  bool usable() const { return reason == Reason::end_time || reason == Reason::observer; }
};

struct MarchSettings {
  double step_ceiling = std::numeric_limits<double>::infinity();  // s; for the eye, not for accuracy
  /// The finest rung of the exact march's ladder: largest rate times rung <= 2^-fineness.
  int fineness = 6;
  bool keep_moments = false;  // exact march: integrals of the products of states, for energies
  double relative = 1e-6;     // IDA's tolerance
};

class March {
 public:
  virtual ~March() = default;
  /// Runs to `until` (exactly) or to a failure. Observers may be null.
  virtual MarchReport run(MarchState& state, double until, Observer* observer) = 0;
  /// Cells, inputs and probe bits for energy coordinates xi at a time. Throws CircuitError where no cells fit.
  virtual MarchState stand(const Eigen::VectorXd& xi, double time) = 0;
};

/// Both refer to `circuit`, which must outlive them.
std::unique_ptr<March> exact_march(const Circuit& circuit, const MarchSettings& settings);
std::unique_ptr<March> ida_march(const Circuit& circuit, const MarchSettings& settings);

}  // namespace couplet
