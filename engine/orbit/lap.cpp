// SPDX-License-Identifier: MIT
#include "engine/orbit/lap.h"

#include <cmath>

namespace couplet {
namespace {

/// Multiplies up the monodromy matrix as the spans go by.
class Monodromy : public Observer {
 public:
  Monodromy(ExactMarch& march, int states, int size) : march_(march), states_(states), matrix(Eigen::MatrixXd::Identity(states, states)), column_(padded(size), 0.0), next_(column_) {}

  void span(const Span& span) override {
    if (last_ && span.topology != last_) jump(*last_, *span.topology, span.x0);
    const Flow& flow = march_.flow(*span.topology);
    for (int c = 0; c < states_; ++c) {
      std::copy_n(matrix.col(c).data(), states_, column_.begin());
      std::fill(column_.begin() + states_, column_.end(), 0.0);
      march_.advance(flow, column_.data(), span.duration, next_.data());
      std::copy_n(next_.begin(), states_, matrix.col(c).data());
    }
    last_ = span.topology;
    guard_.resize(0);
  }

  void event(const Event& event) override {
    // Only events decided by the state move with it; commands and corners keep their times.
    if (event.kind != Event::Kind::region) return;
    const Topology& before = *event.after;
    for (std::size_t i = 0; i < before.watches.size(); ++i) {
      if (before.watches[i].branch == event.branch && before.watches[i].condition == event.condition) guard_ = before.watch_rows.row(static_cast<int>(i)).transpose();
    }
  }

 private:
  void jump(const Topology& before, const Topology& after, const double* x) {
    if (guard_.size() == 0) return;
    const Eigen::Map<const Eigen::VectorXd> state(x, before.A.cols());
    const Eigen::VectorXd field_before = before.A * state, step = (after.A * state - field_before).head(states_);
    if (step.norm() <= 1e-8 * field_before.head(states_).norm()) return;
    const double approach = guard_.dot(field_before);
    if (approach == 0) return;
    matrix += (step / approach) * (guard_.head(states_).transpose() * matrix);
  }

  ExactMarch& march_;
  int states_;

 public:
  Eigen::MatrixXd matrix;

 private:
  Buffer column_, next_;
  const Topology* last_ = nullptr;
  Eigen::VectorXd guard_;
};

/// Passes everything on and asks for a stop at the wanted return.
class UntilReturn : public Observer {
 public:
  UntilReturn(double earliest, std::vector<Observer*> others) : earliest_(earliest), others_(std::move(others)) {}
  void span(const Span& span) override {
    for (auto* o : others_) o->span(span);
  }
  void event(const Event& event) override {
    if (event.kind == Event::Kind::probe && event.condition == 0 && event.bit && event.time > earliest_) done_ = true;
    for (auto* o : others_) o->event(event);
  }
  bool enough() const override { return done_; }

 private:
  double earliest_;
  std::vector<Observer*> others_;
  bool done_ = false;
};

}  // namespace

Lapper::Lapper(const Circuit& circuit, const Section& section, const MarchSettings& settings)
    : circuit_(circuit), section_(section), march_(circuit, settings) {
  for (const auto& wave : circuit.sheet().waveforms) {
    if (!wave.points.empty() && wave.period <= 0) base_ = std::max(base_, wave.points.back().time);
  }
  if (section.driven) base_ = std::ceil(base_ / section.period - 1e-9) * section.period;
}

Lap Lapper::lap(const MarchState& from, double period, int returns, bool with_monodromy, Observer* also) {
  Lap lap;
  lap.end = from;
  lap.end.time = base_;
  lap.end.x.tail(circuit_.inputs()) = circuit_.inputs_at(base_);
  Monodromy monodromy(march_, circuit_.states(), circuit_.size());
  std::vector<Observer*> others;
  if (with_monodromy) others.push_back(&monodromy);
  if (also) others.push_back(also);
  for (int r = 0; r < returns; ++r) {
    const double begin = lap.end.time;
    const double until = section_.driven ? base_ + (r + 1) * section_.period : begin + 20 * period;
    UntilReturn observer(section_.driven ? until + period : begin + 0.6 * period, others);
    const MarchReport report = march_.run(lap.end, until, &observer);
    ++laps;
    if (!report.usable() || (!section_.driven && report.reason != MarchReport::Reason::observer)) {
      lap.trouble = report.usable() ? "the section was not crossed again" : report.sentence;
      return lap;
    }
  }
  lap.duration = lap.end.time - base_;
  lap.returned = true;
  if (with_monodromy) lap.monodromy = std::move(monodromy.matrix);
  return lap;
}

bool Lapper::seat(MarchState& state, const Eigen::VectorXd& xi, std::string& trouble) {
  state.time = base_;
  state.x.head(circuit_.states()) = xi;
  state.x.tail(circuit_.inputs()) = circuit_.inputs_at(base_);
  return march_.resume(state, trouble);
}

Eigen::VectorXd Lapper::section_row(const MarchState& state) const {
  return circuit_.row_over_state(circuit_.topology(state.cells), section_.form).head(circuit_.states()).transpose();
}

double Lapper::section_value(const MarchState& state) const {
  return circuit_.row_over_state(circuit_.topology(state.cells), section_.form).dot(state.x);
}

Eigen::VectorXd Lapper::field(const MarchState& state) const {
  return (circuit_.topology(state.cells).A * state.x).head(circuit_.states());
}

}  // namespace couplet
