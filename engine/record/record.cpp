// SPDX-License-Identifier: MIT
#include "engine/record/record.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace couplet {
namespace {

// Rows to a chunk: what a killed run loses at most, against the share of the index.
constexpr int full_chunk = 2048, period_chunk = 512, event_chunk = 1024;
const std::vector<std::string> kinds = {"region", "probe", "command", "corner"};
constexpr double none = std::numeric_limits<double>::quiet_NaN();

std::string key_of(std::string name) {
  std::replace(name.begin(), name.end(), '/', '_');
  return name;
}

std::vector<std::string> all_states(const Sheet& sheet) {
  std::vector<std::string> states;
  for (const auto& branch : sheet.branches) {
    for (const auto& cell : branch.cells) {
      if (std::find(states.begin(), states.end(), cell.state) == states.end()) states.push_back(cell.state);
    }
  }
  return states;
}

}  // namespace

struct RecordWriter::Columns {
  std::unique_ptr<Column<double>> full_time, period_start, period_duration, event_time, region_time;
  std::unique_ptr<Column<std::int32_t>> stretches, event_kind, event_name, event_state, region_branch,
      region_state;
  std::vector<Column<double>> full;
  std::vector<Column<float>> minimum, maximum, mean;
};

RecordWriter::RecordWriter(const std::string& path, const Design& design,
                           const std::vector<std::string>& options, const std::string& version, bool replace)
    : file_(Hdf5File::create(path, replace)) {
  file_.text("/netlist/text", design.text, "the netlist as it was read");
  file_.text("/netlist/file", design.file, "its file");
  file_.text("/netlist/sha256", design.sha256, "SHA-256 of the text");
  file_.text("/netlist/title", design.title, "title");
  file_.text("/program/version", version, "version of couplet");
  file_.texts("/program/options", options, "the command line");
  file_.flush();
}

RecordWriter::~RecordWriter() = default;

void RecordWriter::begin(const Sheet& sheet, const std::vector<Signal>& signals) {
  columns_ = std::make_unique<Columns>();
  Columns& c = *columns_;
  states_ = all_states(sheet);
  const auto real = [&](const std::string& name, int chunk, const std::string& unit,
                        const std::string& label) {
    return std::make_unique<Column<double>>(file_, name, chunk, unit, label);
  };
  const auto index = [&](const std::string& name, int chunk, const std::string& label) {
    return std::make_unique<Column<std::int32_t>>(file_, name, chunk, "", label);
  };
  std::vector<std::string> names, units, keys;
  for (const auto& s : signals)
    names.push_back(s.name), units.push_back(s.unit), keys.push_back(key_of(s.name));
  file_.texts("/signals/name", names, "name of each signal");
  file_.texts("/signals/unit", units, "unit of each signal");
  file_.texts("/signals/key", keys,
              "dataset of each signal in /full, /periods/minimum, /periods/maximum, /periods/mean");

  c.full_time = real("/full/time", full_chunk, "s", "time");
  c.stretches = index("/full/stretches", 1, "row at which each unbroken stretch of detail begins");
  c.period_start = real("/periods/start", period_chunk, "s", "start of the period");
  c.period_duration = real("/periods/duration", period_chunk, "s",
                           "duration of the period; the last one may be cut short by the end of the march");
  file_.make_scale("/full/time", "time");
  file_.make_scale("/periods/start", "start of the period");
  const auto summary = [&](std::vector<Column<float>>& columns, const std::string& which, std::size_t i) {
    const std::string name = "/periods/" + which + "/" + keys[i];
    columns.emplace_back(file_, name, period_chunk, units[i], which + " of " + names[i] + " in the period");
    file_.axis(name, "/periods/start");
  };
  for (std::size_t i = 0; i < signals.size(); ++i) {
    c.full.emplace_back(file_, "/full/" + keys[i], full_chunk, units[i], names[i]);
    file_.axis("/full/" + keys[i], "/full/time");
    summary(c.minimum, "minimum", i);
    summary(c.maximum, "maximum", i);
    summary(c.mean, "mean", i);
  }

  std::vector<std::string> who, branches;
  for (const auto& part : sheet.parts) who.push_back(part.name);
  for (const auto& probe : sheet.probes) who.push_back(probe.name);
  for (const auto& branch : sheet.branches) branches.push_back(branch.name);
  file_.texts("/events/kinds", kinds, "what kind means");
  file_.texts("/events/names", who, "what name means: parts, then probes");
  file_.texts("/events/states", states_, "what state means");
  file_.texts("/regions/branches", branches, "what branch means");
  file_.texts("/regions/states", states_, "what state means");
  c.event_time = real("/events/time", event_chunk, "s", "time");
  c.event_kind = index("/events/kind", event_chunk, "index into kinds");
  c.event_name = index("/events/name", event_chunk, "index into names; -1: none");
  c.event_state = index("/events/state", event_chunk, "index into states, after the event; -1: none");
  c.region_time = real("/regions/time", event_chunk, "s", "time from which the branch is in the state");
  c.region_branch = index("/regions/branch", event_chunk, "index into branches");
  c.region_state = index("/regions/state", event_chunk, "index into states");
  file_.flush();
}

void RecordWriter::new_stretch() {
  columns_->stretches->append(static_cast<std::int32_t>(columns_->full_time->rows()));
}

void RecordWriter::full(double time, const double* values) {
  Columns& c = *columns_;
  c.full_time->append(time);
  for (std::size_t i = 0; i < c.full.size(); ++i) c.full[i].append(values[i]);
  if (c.full_time->rows() % full_chunk == 0) file_.flush_if_due();
}

void RecordWriter::period(double start, double duration, const double* minimum, const double* maximum,
                          const double* mean) {
  Columns& c = *columns_;
  c.period_start->append(start);
  c.period_duration->append(duration);
  for (std::size_t i = 0; i < c.full.size(); ++i) {
    c.minimum[i].append(static_cast<float>(minimum[i]));
    c.maximum[i].append(static_cast<float>(maximum[i]));
    c.mean[i].append(static_cast<float>(mean[i]));
  }
  if (c.period_start->rows() % period_chunk == 0) file_.flush_if_due();
}

void RecordWriter::event(double time, Event::Kind kind, int name, int state) {
  Columns& c = *columns_;
  c.event_time->append(time);
  c.event_kind->append(static_cast<int>(kind));
  c.event_name->append(name);
  c.event_state->append(state);
}

void RecordWriter::region(double time, int branch, int state) {
  Columns& c = *columns_;
  c.region_time->append(time);
  c.region_branch->append(branch);
  c.region_state->append(state);
}

int RecordWriter::state_index(const std::string& state) const {
  const auto found = std::find(states_.begin(), states_.end(), state);
  return found == states_.end() ? -1 : static_cast<int>(found - states_.begin());
}

void RecordWriter::figures(const Figures& figures) {
  std::vector<std::string> names, units;
  std::vector<double> values, when;
  for (const auto& f : figures.all()) {
    names.push_back(f.name), units.push_back(f.unit), values.push_back(f.value),
        when.push_back(f.when.value_or(none));
  }
  file_.texts("/figures/name", names, "name of each figure");
  file_.texts("/figures/unit", units, "unit of each value");
  file_.numbers("/figures/value", values, "", "value of each figure, in its unit");
  file_.numbers("/figures/when", when, "s", "time of an extreme; not a number: none");
  file_.flush();
}

void RecordWriter::verdicts(const std::vector<Verdict>& verdicts) {
  std::vector<std::string> names, figures, units, status, why, source;
  std::vector<double> value, at_least, at_most, margin, percent, when;
  for (const auto& v : verdicts) {
    names.push_back(v.name), figures.push_back(v.figure), units.push_back(v.unit),
        status.push_back(status_word(v.status));
    why.push_back(v.why), source.push_back(v.source), value.push_back(v.value);
    at_least.push_back(v.at_least.value_or(none)), at_most.push_back(v.at_most.value_or(none));
    margin.push_back(v.margin), percent.push_back(v.margin_percent), when.push_back(v.when.value_or(none));
  }
  file_.texts("/verdicts/name", names, "name of each limit");
  file_.texts("/verdicts/figure", figures, "the figure judged");
  file_.texts("/verdicts/unit", units, "unit of value, limits and margin");
  file_.texts("/verdicts/status", status, "the verdict");
  file_.texts("/verdicts/why", why, "why the limit is set");
  file_.texts("/verdicts/source", source, "where the limit comes from");
  file_.numbers("/verdicts/value", value, "", "value of the figure, in its unit");
  file_.numbers("/verdicts/at_least", at_least, "", "lower limit, in its unit; not a number: none");
  file_.numbers("/verdicts/at_most", at_most, "", "upper limit, in its unit; not a number: none");
  file_.numbers("/verdicts/margin", margin, "", "margin in its unit, negative where the limit is broken");
  file_.numbers("/verdicts/margin_percent", percent, "%", "margin as a share of the limit");
  file_.numbers("/verdicts/when", when, "s", "time of the value; not a number: none");
  file_.flush();
}

void RecordWriter::report(const MarchReport& report) {
  file_.text("/program/sentence", report.sentence, "why the march ended");
  file_.attribute("/program", "steps", static_cast<double>(report.steps));
  file_.attribute("/program", "refused", static_cast<double>(report.refused));
  file_.attribute("/program", "events", static_cast<double>(report.events));
  file_.attribute("/program", "commands", static_cast<double>(report.commands));
  file_.attribute("/program", "corners", static_cast<double>(report.corners));
  file_.attribute("/program", "topologies", static_cast<double>(report.topologies));
  file_.attribute("/program", "seconds", report.seconds);
  file_.attribute("/program", "seconds_building", report.seconds_building);
  file_.flush();
}

void RecordWriter::close() {
  if (columns_) {
    Columns& c = *columns_;
    for (auto* column : {&c.full_time, &c.period_start, &c.period_duration, &c.event_time, &c.region_time})
      (*column)->end();
    for (auto* column :
         {&c.stretches, &c.event_kind, &c.event_name, &c.event_state, &c.region_branch, &c.region_state})
      (*column)->end();
    for (auto& column : c.full) column.end();
    for (auto* columns : {&c.minimum, &c.maximum, &c.mean}) {
      for (auto& column : *columns) column.end();
    }
    columns_.reset();
  }
  file_.close();
}

std::uint64_t RecordWriter::full_rows() const { return columns_ ? columns_->full_time->rows() : 0; }
std::uint64_t RecordWriter::period_rows() const { return columns_ ? columns_->period_start->rows() : 0; }

}  // namespace couplet
