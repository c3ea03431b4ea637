// SPDX-License-Identifier: MIT
// The second opinion: the raw system E dz/dt + G z + H u = 0 through SUNDIALS IDA, variable order and step, with root
// functions for the watched conditions. It shares the assembly of E, G, H and the decision of the cells with the exact
// march, but not the reduction, the exponentials or the event search. The only file that sees IDA.
#include <fmt/format.h>
#include <ida/ida.h>
#include <nvector/nvector_serial.h>
#include <sunlinsol/sunlinsol_dense.h>
#include <sunmatrix/sunmatrix_dense.h>

#include <chrono>
#include <cmath>

#include "engine/march/exact.h"

namespace couplet {
namespace {

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

template <class T, void (*free_it)(T)>
class Handle {
 public:
  explicit Handle(T it = nullptr) : it_(it) {}
  ~Handle() {
    if (it_) free_it(it_);
  }
  Handle(const Handle&) = delete;
  Handle& operator=(const Handle&) = delete;
  void reset(T it) {
    if (it_) free_it(it_);
    it_ = it;
  }
  T get() const { return it_; }

 private:
  T it_;
};

void free_vector(N_Vector v) { N_VDestroy(v); }
void free_matrix(SUNMatrix m) { SUNMatDestroy(m); }
void free_solver(SUNLinearSolver s) { SUNLinSolFree(s); }
void free_memory(void* m) { IDAFree(&m); }
void free_context(SUNContext c) { SUNContext_Free(&c); }
void no_message(int, const char*, const char*, char*, void*) {}

class IdaMarch : public March, private Interpolant {
 public:
  IdaMarch(const Circuit& circuit, const MarchSettings& settings) : circuit_(circuit), settings_(settings), decider_(circuit, MarchSettings{}) {
    SUNContext context = nullptr;
    SUNContext_Create(nullptr, &context);
    context_.reset(context);
    const int n = circuit.unknowns();
    z_.reset(N_VNew_Serial(n, context));
    zp_.reset(N_VNew_Serial(n, context));
    weights_.reset(N_VNew_Serial(n, context));
    differential_.reset(N_VNew_Serial(n, context));
    largest_ = Eigen::VectorXd::Zero(n);
  }

  MarchState stand(const Eigen::VectorXd& xi, double time) override { return decider_.stand(xi, time); }
  MarchReport run(MarchState& state, double until, Observer* observer) override;

 private:
  using Vector = Eigen::Map<Eigen::VectorXd>;
  Vector vector(N_Vector v) const { return {N_VGetArrayPointer(v), circuit_.unknowns()}; }

  static int residual(double t, N_Vector z, N_Vector zp, N_Vector r, void* self_pointer) {
    auto& self = *static_cast<IdaMarch*>(self_pointer);
    self.inputs_ = self.circuit_inputs(t);
    self.vector(r) = self.circuit_.mass() * self.vector(zp) + self.G_ * self.vector(z) + self.H_ * self.inputs_;
    return 0;
  }
  static int jacobian(double, double cj, N_Vector, N_Vector, N_Vector, SUNMatrix J, void* self_pointer, N_Vector, N_Vector, N_Vector) {
    auto& self = *static_cast<IdaMarch*>(self_pointer);
    const int n = self.circuit_.unknowns();
    Eigen::Map<Eigen::MatrixXd>(SUNDenseMatrix_Data(J), n, n) = self.G_ + cj * self.circuit_.mass();
    return 0;
  }
  static int roots(double t, N_Vector z, N_Vector, double* g, void* self_pointer) {
    auto& self = *static_cast<IdaMarch*>(self_pointer);
    const Eigen::VectorXd u = self.circuit_inputs(t);
    for (int i = 0; i < static_cast<int>(self.guards_.rows()); ++i) {
      g[i] = self.guards_.row(i).dot(self.vector(z)) + self.guards_inputs_.row(i).dot(u);
    }
    return 0;
  }

  /// Inputs within a span: corners lie at its ends only, so the slope there extends the value from the start.
  Eigen::VectorXd circuit_inputs(double t) const {
    Eigen::VectorXd u = circuit_.inputs_at(span_start_);
    for (std::size_t w = 0; w < circuit_.sheet().waveforms.size(); ++w) {
      const int i = circuit_.input_of_waveform(static_cast<int>(w));
      if (circuit_.sheet().waveforms[w].points.empty()) {
        const Eigen::VectorXd now_u = circuit_.inputs_at(t);
        u[i] = now_u[i], u[i + 1] = now_u[i + 1];
      } else {
        u[i] += u[i + 1] * (t - span_start_);
      }
    }
    return u;
  }

  void at(double tau, double* x) const override {
    auto& self = const_cast<IdaMarch&>(*this);
    IDAGetDky(memory_.get(), shown_start_ + tau, 0, self.weights_.get());
    self.to_state(shown_start_ + tau, self.weights_.get(), x);
  }

  void to_state(double t, N_Vector z, double* x) {
    const Eigen::VectorXd w = circuit_.outputs_from_unknowns(vector(z));
    Eigen::Map<Eigen::VectorXd>(x, circuit_.states()) = circuit_.state_from_outputs(w);
    Eigen::Map<Eigen::VectorXd>(x + circuit_.states(), circuit_.inputs()) = circuit_inputs(t);
  }

  bool restart(MarchState& state);
  bool flip(MarchState& state, const std::vector<int>& found, Observer* observer, MarchReport& report);
  bool outside(MarchState& state, Observer* observer, MarchReport& report);

  const Circuit& circuit_;
  MarchSettings settings_;
  ExactMarch decider_;  // decides cells; marches nothing
  Handle<SUNContext, free_context> context_;
  Handle<N_Vector, free_vector> z_, zp_, weights_, differential_;
  Handle<SUNMatrix, free_matrix> matrix_;
  Handle<SUNLinearSolver, free_solver> solver_;
  Handle<void*, free_memory> memory_;
  Eigen::MatrixXd G_, H_, guards_, guards_inputs_;
  std::vector<int> guard_watch_;
  Eigen::VectorXd inputs_, largest_;
  double span_start_ = 0, shown_start_ = 0;
  const Topology* topology_ = nullptr;
  std::string trouble_;
};

/// Consistent z and dz/dt from the topology at the state, and a fresh IDA: after an event the past is of no use.
bool IdaMarch::restart(MarchState& state) {
  topology_ = &circuit_.topology(state.cells);
  circuit_.conductance(state.cells, G_, H_);
  span_start_ = state.time;
  const Eigen::VectorXd w = topology_->C * state.x, slope = topology_->C * (topology_->A * state.x);
  const auto& rows = circuit_.unknown_rows();
  for (int i = 0; i < circuit_.unknowns(); ++i) {
    vector(z_.get())[i] = w[rows[i]];
    vector(zp_.get())[i] = slope[rows[i]];
    largest_[i] = std::max(largest_[i], std::abs(w[rows[i]]));
  }
  // Root functions: guards whose condition is watched, but not one that rests at zero and leaves it on its own side.
  std::vector<Eigen::RowVectorXd> over_z, over_u;
  guard_watch_.clear();
  for (std::size_t i = 0; i < topology_->watches.size(); ++i) {
    const Watch& watch = topology_->watches[i];
    const Form* form = nullptr;
    bool bit = watch.bit;
    if (watch.branch < 0) {
      form = &circuit_.sheet().probes[watch.condition].form;
      bit = state.probe_bits[watch.condition] != 0;
    } else {
      const Condition& c = circuit_.sheet().branches[watch.branch].conditions[watch.condition];
      form = c.hysteresis && watch.bit ? &c.held : &c.form;
    }
    Eigen::VectorXd outputs, inputs;
    circuit_.form_rows(*form, outputs, inputs);
    Eigen::RowVectorXd row(circuit_.unknowns());
    const double sign = bit ? 1 : -1;
    for (int k = 0; k < circuit_.unknowns(); ++k) {
      Eigen::VectorXd unit = Eigen::VectorXd::Zero(circuit_.unknowns());
      unit[k] = sign;
      row[k] = outputs.dot(circuit_.outputs_from_unknowns(unit));
    }
    over_z.push_back(row);
    over_u.push_back(sign * inputs.transpose());
    guard_watch_.push_back(static_cast<int>(i));
  }
  guards_.resize(static_cast<int>(over_z.size()), circuit_.unknowns());
  guards_inputs_.resize(static_cast<int>(over_z.size()), circuit_.inputs());
  for (std::size_t i = 0; i < over_z.size(); ++i) guards_.row(static_cast<int>(i)) = over_z[i], guards_inputs_.row(static_cast<int>(i)) = over_u[i];

  // Absolute tolerance of each unknown from the largest of its kind (volts, amperes) seen so far.
  double volts = 0, amperes = 0;
  const int nodes = static_cast<int>(circuit_.sheet().nodes.size()) - 1;
  for (int i = 0; i < circuit_.unknowns(); ++i) (i < nodes ? volts : amperes) = std::max(i < nodes ? volts : amperes, largest_[i]);
  for (int i = 0; i < circuit_.unknowns(); ++i) {
    const double size = i < nodes ? volts : amperes;
    vector(weights_.get())[i] = settings_.relative * (size > 0 ? size : 1e-3);
    vector(differential_.get())[i] = circuit_.mass().row(i).cwiseAbs().sum() > 0 ? 1 : 0;
  }
  const int n = circuit_.unknowns();
  memory_.reset(IDACreate(context_.get()));
  void* memory = memory_.get();
  if (!matrix_.get()) matrix_.reset(SUNDenseMatrix(n, n, context_.get()));
  solver_.reset(SUNLinSol_Dense(z_.get(), matrix_.get(), context_.get()));
  bool good = IDASetErrHandlerFn(memory, no_message, nullptr) >= 0;
  good = good && IDAInit(memory, residual, span_start_, z_.get(), zp_.get()) >= 0;
  good = good && IDASVtolerances(memory, settings_.relative, weights_.get()) >= 0;
  good = good && IDASetUserData(memory, this) >= 0;
  good = good && IDASetLinearSolver(memory, solver_.get(), matrix_.get()) >= 0;
  good = good && IDASetJacFn(memory, jacobian) >= 0;
  good = good && IDASetMaxNumSteps(memory, -1) >= 0;
  if (std::isfinite(settings_.step_ceiling)) good = good && IDASetMaxStep(memory, settings_.step_ceiling) >= 0;
  if (!guard_watch_.empty()) {
    good = good && IDARootInit(memory, static_cast<int>(guard_watch_.size()), roots) >= 0;
    std::vector<int> falling(guard_watch_.size(), -1);
    good = good && IDASetRootDirection(memory, falling.data()) >= 0 && IDASetNoInactiveRootWarn(memory) >= 0;
  }
  return good;
}

bool IdaMarch::flip(MarchState& state, const std::vector<int>& found, Observer* observer, MarchReport& report) {
  std::vector<char> flipped(circuit_.sheet().branches.size(), 0);
  for (int i = 0; i < static_cast<int>(found.size()); ++i) {
    if (!found[i]) continue;
    const Watch& watch = topology_->watches[guard_watch_[i]];
    ++report.events;
    Event event{watch.branch < 0 ? Event::Kind::probe : Event::Kind::region, state.time, watch.branch, watch.condition, false, topology_, state.x.data()};
    if (watch.branch < 0) {
      state.probe_bits[watch.condition] ^= 1;
      event.bit = state.probe_bits[watch.condition] != 0;
    } else {
      state.bits[watch.branch] ^= 1U << watch.condition;
      flipped[watch.branch] = 1;
      event.bit = (state.bits[watch.branch] >> watch.condition & 1U) != 0;
    }
    if (observer) observer->event(event);
  }
  return decider_.resume_flipped(state, flipped, trouble_);
}

bool IdaMarch::outside(MarchState& state, Observer* observer, MarchReport& report) {
  const Eigen::VectorXd u = circuit_.inputs_at(state.time);
  std::vector<char> flipped(circuit_.sheet().branches.size(), 0);
  bool any = (state.x.tail(circuit_.inputs()) - u).cwiseAbs().maxCoeff() > 0;
  state.x.tail(circuit_.inputs()) = u;
  for (std::size_t b = 0; b < circuit_.sheet().branches.size(); ++b) {
    const Branch& branch = circuit_.sheet().branches[b];
    for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
      if (branch.conditions[c].command < 0) continue;
      const bool bit = circuit_.command_bit(branch.conditions[c].command, state.time);
      if (bit == ((state.bits[b] >> c & 1U) != 0)) continue;
      state.bits[b] ^= 1U << c;
      flipped[b] = 1;
      any = true;
      ++report.commands;
      if (observer) observer->event({Event::Kind::command, state.time, static_cast<int>(b), static_cast<int>(c), bit, topology_, state.x.data()});
    }
  }
  return !any || decider_.resume_flipped(state, flipped, trouble_);
}

MarchReport IdaMarch::run(MarchState& state, double until, Observer* observer) {
  const double began = now();
  MarchReport report;
  topology_ = &circuit_.topology(state.cells);
  const auto fail = [&](MarchReport::Reason reason, const std::string& words) {
    report.reason = reason;
    report.sentence = words;
  };
  int standing = 0;
  if (!outside(state, observer, report)) fail(MarchReport::Reason::no_consistent_cells, trouble_);
  Eigen::VectorXd before = state.x;
  while (report.reason == MarchReport::Reason::not_run) {
    double stop = std::min(until, circuit_.next_corner(state.time));
    for (std::size_t c = 0; c < circuit_.sheet().commands.size(); ++c) stop = std::min(stop, circuit_.next_toggle(static_cast<int>(c), state.time));
    // Closer than the time's round-off: nothing can run in between.
    if (stop - state.time > 8 * std::abs(state.time) * std::numeric_limits<double>::epsilon()) {
      if (!restart(state) || IDASetStopTime(memory_.get(), stop) < 0) {
        fail(MarchReport::Reason::integrator, fmt::format("at {:.9g} s IDA could not be started", state.time));
        break;
      }
      bool event = false;
      while (!event && state.time < stop) {
        before = state.x;
        double t = state.time;
        const double start = state.time;
        const int flag = IDASolve(memory_.get(), stop, &t, z_.get(), zp_.get(), IDA_ONE_STEP);
        if (flag < 0) {
          fail(MarchReport::Reason::integrator, fmt::format("at {:.9g} s IDA gave up (its code {})", state.time, flag));
          break;
        }
        ++report.steps;
        state.time = flag == IDA_TSTOP_RETURN ? stop : t;
        to_state(state.time, z_.get(), state.x.data());
        if (observer && state.time > start) {
          shown_start_ = start;
          const Span span{&circuit_, topology_, start, state.time - start, before.data(), state.x.data(), this};
          observer->span(span);
        }
        if (flag == IDA_ROOT_RETURN) {
          std::vector<int> found(guard_watch_.size(), 0);
          IDAGetRootInfo(memory_.get(), found.data());
          standing = state.time > start ? 0 : standing + 1;
          if (!flip(state, found, observer, report)) fail(MarchReport::Reason::no_consistent_cells, trouble_);
          if (standing > 1000) fail(MarchReport::Reason::events_pile_up, fmt::format("at {:.9g} s regions change back and forth without time passing", state.time));
          event = true;
        }
        if (std::abs(stop - state.time) <= 4 * std::abs(stop) * std::numeric_limits<double>::epsilon()) state.time = stop;
      }
    } else {
      state.time = stop;
    }
    if (report.reason != MarchReport::Reason::not_run) break;
    if (state.time >= stop && !outside(state, observer, report)) fail(MarchReport::Reason::no_consistent_cells, trouble_);
    if (report.reason == MarchReport::Reason::not_run && state.time >= until) fail(MarchReport::Reason::end_time, fmt::format("reached {:.9g} s", until));
    if (report.reason == MarchReport::Reason::not_run && observer && observer->enough()) fail(MarchReport::Reason::observer, fmt::format("stopped at {:.9g} s as asked", state.time));
  }
  report.topologies = circuit_.topologies_built();
  report.seconds = now() - began;
  return report;
}

}  // namespace

std::unique_ptr<March> ida_march(const Circuit& circuit, const MarchSettings& settings) { return std::make_unique<IdaMarch>(circuit, settings); }

}  // namespace couplet
