// SPDX-License-Identifier: MIT
// Watches a march and writes its record: each signal's minimum, maximum and mean per period throughout, and
// full detail at the start, around each scheduled change and over the last periods, in bounded memory.
//
// A signal is an output of the circuit, w = C x. Its slope is C A x, so between two known states it is taken
// as the cubic through values and slopes (Hermite). Where a span is too long for that (more than 5 % of the
// signal's range of curvature, |s1 - s0| h / 2, or 1 % of the third difference, |(s0 + s1) h / 2 - (w1 -
// w0)|) and the signal might leave the range that the period has had so far, the span is halved on the
// march's own interpolant, until it is not. On a sine wave of amplitude a that leaves an error of at most a
// (w h)^4 / 384 = 1e-4 a in an extreme. Means integrate the same cubic: h (w0 + w1) / 2 + h^2 (s0 - s1) / 12
// (the corrected trapezoid); a span that weighs too much in its period (h |s1 - s0| h / 2 above 0.2 % of
// range x period) is halved too.
//
// Detail is not computed while the march runs: the states at the ends of spans are kept for two times `last`
// periods, and only what is to be written is evaluated, exactly, by the flow of its topology.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "engine/march/exact.h"
#include "engine/record/record.h"

namespace couplet {

struct RecorderSettings {
  int probe = -1;  // its rising crossings delimit the periods; -1: periods of fixed length
  double period =
      0;  // s; with a probe: what is expected. A probe silent for 8 of its last periods is helped out
  int points = 64;  // per period of full detail, at least; every event has a point on either side besides
  int start = 20, around = 20, last = 20;  // periods of full detail
  bool all = false;                        // full detail throughout
  std::vector<std::string> signals;        // names as by Circuit::output_name; empty: all
};

/// Signals of a circuit by name (empty: all outputs). Throws InputError with the nearest names where one is
/// unknown.
std::vector<int> choose_outputs(const Circuit& circuit, const std::vector<std::string>& names);

class Recorder : public Observer {
 public:
  /// Both must outlive the recorder (the circuit until follow). Calls writer.begin.
  Recorder(const Circuit& circuit, RecordWriter& writer, const RecorderSettings& settings);

  void span(const Span& span) override;
  void event(const Event& event) override;
  /// A scheduled change falls on `time` (seconds of the march, not in the past): detail is kept around it.
  /// Spans are not cut there, so the march should stop or have a corner at that time.
  void mark(double time);
  /// From the next span on another circuit of the same structure is marched (and marks this instant). The
  /// circuit before must still be there.
  void follow(const Circuit& circuit);
  /// Writes what is held: the last periods. Closes nothing.
  void finish();

 private:
  /// Pieces of the march whose detail is not written yet, oldest first.
  struct Held {
    struct Piece {
      int topology;
      double start, duration, end;  // end: as the next piece or an event has it, to the last digit
      std::size_t state;            // its x0 is states[state], its x1 the next one
      bool event_after;
    };
    struct Happening {
      double time;
      Event::Kind kind;
      int name, branch, state;
    };
    std::vector<Piece> pieces;
    std::vector<double> states;        // padded(circuit size) each
    std::vector<std::size_t> periods;  // piece at which each whole period has ended
    std::vector<Happening> happenings;
    void clear();
  };
  enum class Closing { probe, clock };

  void enter(const Circuit& circuit);
  const Buffer& rows(const Topology& topology);
  void measure(const Span& span, const Buffer& rows);
  void measure_part(const Span& span, const Buffer& rows, double from, double to, const double* at0,
                    const double* at1, int depth);
  bool resolved(double h, const double* at0, const double* at1) const;
  void gather(double h, const double* at0, const double* at1);
  void gather_turns(double h, const double* at0, const double* at1);
  double due() const;
  void close_period(double time, Closing closing);
  void renew_ranges();
  void before_span(const Topology* topology);
  bool continues(const Span& span) const;
  void hold(const Span& span);
  void write_held(int periods);
  void write(const Held& held, std::size_t first);
  void write_regions(int topology, double time);
  void point(const Topology& topology, double time, const double* x);
  bool detailed() const { return settings_.all || detail_left_ > 0; }

  const Circuit* circuit_ = nullptr;
  RecordWriter& writer_;
  RecorderSettings settings_;
  std::vector<int> outputs_;
  int count_, stride_, n_ = 0, state_stride_ = 0;
  std::unique_ptr<ExactMarch> evaluator_;      // for states between those held
  std::vector<std::vector<int>> state_names_;  // of each branch and cell

  // Values and slopes of the signals.
  std::vector<Buffer> rows_;    // by topology, 2 * stride_ rows over x
  std::vector<Buffer> halves_;  // at the middle, by depth of halving
  Buffer first_, last_, cut_, x_, next_;
  int last_topology_ = -1;
  double last_time_;

  // The period so far, by signal.
  Buffer low_, high_, sum_;
  Buffer range_low_, range_high_, range_;  // of the march so far
  std::vector<int> is_volts_;
  double period_start_ = 0, period_, origin_ = 0;  // period_: the last one's duration
  long spans_ = 0, clock_ticks_ = 0;
  Closing last_closing_ = Closing::clock;
  bool probe_rose_ = false;
  double probe_time_ = 0;

  Held before_, now_;
  std::size_t settled_ = 0;  // happenings of now_ whose state is known
  int detail_left_;          // periods of detail to come
  std::vector<double> marks_;
  double written_until_, last_point_;
  int written_topology_ = -1;
};

}  // namespace couplet
