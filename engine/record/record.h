// SPDX-License-Identifier: MIT
// The record of a run: an HDF5 file with everything needed to look again.
//
//   /program            version, options, sentence of why the march ended, counts and seconds (attributes and
//   texts) /netlist            file, sha256, text, title /full               detail: time, one dataset a
//   signal, `stretches` (row at which each unbroken stretch begins) /periods            start, duration, and
//   minimum/SIGNAL, maximum/SIGNAL, mean/SIGNAL (single precision) /events             in the stretches of
//   detail: time, kind, name, state (indices into kinds, names, states) /regions            in the stretches
//   of detail: time, branch, state: from then on the branch is in that state; a
//                       stretch begins with one row for each branch that has several
//   /figures            name, value, unit, when
//   /verdicts           name, figure, status, value, limits, margin, why, source
//
// Every dataset of numbers has `unit` (where it has one) and `label` attributes; signals have their time as
// dimension scale. In names of datasets '/' is written '_'.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "engine/figures/verdict.h"
#include "engine/march/march.h"
#include "engine/record/hdf5_file.h"

namespace couplet {

struct Signal {
  std::string name;  // "voltage of rail"
  std::string unit;  // SI
};

class RecordWriter {
 public:
  /// Makes the file with /netlist and /program. `options` are the command line, word by word. An existing
  /// file is kept (RecordError) unless `replace`.
  RecordWriter(const std::string& path, const Design& design, const std::vector<std::string>& options,
               const std::string& version, bool replace = false);
  ~RecordWriter();

  /// Makes the growing datasets; once, before any of the following.
  void begin(const Sheet& sheet, const std::vector<Signal>& signals);
  /// The next row of full detail does not continue the last one.
  void new_stretch();
  /// One row of full detail; `values` by signal. Times do not decrease; two rows at one time are the sides of
  /// a jump.
  void full(double time, const double* values);
  void period(double start, double duration, const double* minimum, const double* maximum,
              const double* mean);
  /// `name`: index of a part, or number of parts + index of a probe, or -1; `state` as by state_index, or -1.
  void event(double time, Event::Kind kind, int name, int state);
  void region(double time, int branch, int state);
  int state_index(const std::string& state) const;

  void figures(const Figures& figures);
  void verdicts(const std::vector<Verdict>& verdicts);
  void report(const MarchReport& report);
  /// Writes what is held and closes the file. A writer destroyed without it leaves the file as at the last
  /// flush.
  void close();
  const std::string& path() const { return file_.path(); }
  Hdf5File& file() { return file_; }
  std::uint64_t full_rows() const;
  std::uint64_t period_rows() const;

 private:
  struct Columns;
  Hdf5File file_;
  std::unique_ptr<Columns> columns_;
  std::vector<std::string> states_;
};

/// Reads a record, also one of a killed run (then finished() is false, and all columns of a group are cut to
/// the shortest). Throws RecordError.
class RecordReader {
 public:
  explicit RecordReader(const std::string& path);

  struct Netlist {
    std::string file, sha256, text, title;
  };
  struct Program {
    std::string version, sentence;
    std::vector<std::string> options;
    double steps = 0, refused = 0, events = 0, commands = 0, corners = 0, topologies = 0, seconds = 0,
           seconds_building = 0;
  };
  struct Periods {
    std::vector<double> start, duration;  // s
  };
  struct PeriodValues {
    std::vector<double> minimum, maximum, mean;
  };
  struct Events {
    std::vector<std::string> kinds, names, states;
    std::vector<double> time;
    std::vector<int> kind, name, state;
  };
  struct Regions {
    std::vector<std::string> branches, states;
    std::vector<double> time;
    std::vector<int> branch, state;
  };

  bool finished() const;
  Netlist netlist() const;
  Program program() const;
  const std::vector<Signal>& signals() const { return signals_; }
  int signal(const std::string& name) const;  // -1: none
  std::vector<double> full_time() const;
  std::vector<double> full(int signal) const;
  std::vector<std::size_t> stretches() const;  // first row of each
  Periods periods() const;
  PeriodValues period_values(int signal) const;
  Events events() const;
  Regions regions() const;
  Figures figures() const;
  std::vector<Verdict> verdicts() const;

 private:
  std::vector<double> column(const std::string& name, std::size_t rows) const;
  std::vector<int> indices(const std::string& name, std::size_t rows) const;
  std::size_t shortest(const std::vector<std::string>& names) const;
  Hdf5File file_;
  std::vector<Signal> signals_;
  std::vector<std::string> keys_;  // names of datasets
  std::size_t full_rows_ = 0, period_rows_ = 0;
};

}  // namespace couplet
