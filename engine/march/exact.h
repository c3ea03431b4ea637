// SPDX-License-Identifier: MIT
// The exact march; march.h says what it does, flow.h and crossing.h how. Public beyond the March interface because
// orbits want its segments and moments.
#pragma once

#include "engine/march/crossing.h"
#include "engine/march/flow.h"
#include "engine/march/march.h"

namespace couplet {

/// Sums, over the smooth steps of a march, from which the integrals of all products of states follow exactly.
class Moments {
 public:
  void clear();
  /// integral of x x' dt spent in each topology (by id; empty where never visited). Unit of x squared times s.
  std::vector<Eigen::MatrixXd> integrals(const std::vector<std::unique_ptr<Flow>>& flows) const;

 private:
  friend class ExactMarch;
  struct PerTopology {
    std::vector<Buffer> rung_squares;
    Buffer rest;  // integral of x x' over the stretches shorter than the finest rung
  };
  std::vector<PerTopology> topologies_;
};

class ExactMarch : public March, private Interpolant {
 public:
  ExactMarch(const Circuit& circuit, const MarchSettings& settings);

  MarchReport run(MarchState& state, double until, Observer* observer) override;
  MarchState stand(const Eigen::VectorXd& xi, double time) override;

  /// Decides the cells again for a state whose x was changed from outside, keeping its bits where they hold. False
  /// where no cells fit; `trouble` says why.
  bool resume(MarchState& state, std::string& trouble);
  /// The same where the bits of some branches (flag by branch) have just been changed.
  bool resume_flipped(MarchState& state, const std::vector<char>& flipped, std::string& trouble);

  const Circuit& circuit() const { return circuit_; }
  MarchSettings& settings() { return settings_; }
  /// Flow of a topology met so far or new.
  const Flow& flow(const Topology& topology);
  Moments& moments() { return moments_; }
  std::vector<Eigen::MatrixXd> moment_integrals() const { return moments_.integrals(flows_); }
  /// x at `tau` after x0 in a topology, exactly.
  void advance(const Flow& flow, const double* x0, double tau, double* x);

 private:
  /// What is known of the end of a step that is checked.
  enum class End { open, own_event, other_event };
  enum class Outcome { clear, crossing, unresolved };
  struct Finding {
    Outcome outcome = Outcome::clear;
    int watch = -1;
    double root = 0;    // fraction of the step
    double shrink = 2;  // unresolved: by how much the step is likely too long
  };

  void at(double tau, double* x) const override;  // Interpolant of the span being shown
  void enter(const Topology& topology);
  Finding check(double h, const double* v0, const double* v1, const double* x0, const double* x1, int exempt, bool finest);
  Finding examine(const GuardStep& g, double h, int watch, const double* x0, const double* x1, End end, bool finest) const;
  bool attempt(double h, int rung);
  Finding locate(double h, Finding found);
  void accept(double h);
  void flip_event(Observer* observer, int watch);
  bool apply_outside(Observer* observer);
  bool decide(std::string& trouble);
  void refresh_bits(int branch);
  std::string pile_up_sentence() const;

  const Circuit& circuit_;
  MarchSettings settings_;
  std::vector<std::unique_ptr<Flow>> flows_;
  Moments moments_;

  MarchState* state_ = nullptr;
  MarchReport report_;
  const Flow* flow_ = nullptr;
  int n_, stride_;
  double time_low_ = 0;  // the part of the time below state_->time's last digit
  double hint_ = 0;      // step length to try next, s
  std::vector<double> signs_;
  Buffer x_, next_, guards0_, guards1_, terms_, scratch_;
  // The pieces of the last attempt, for the moments.
  std::vector<Buffer> path_;
  std::vector<int> path_rungs_;
  int path_length_ = 0;
  double tail_ = 0;  // length of the last piece, by series
  Buffer tail_terms_;
  std::vector<char> changed_;  // branches whose bits changed outside their watched conditions
  Eigen::VectorXd outputs_;
  int standing_events_ = 0;    // events since the time last moved on
  std::vector<int> recent_;    // branches of those
  mutable Buffer show_;
  const double* shown_from_ = nullptr;
};

}  // namespace couplet
