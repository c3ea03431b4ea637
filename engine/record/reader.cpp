// SPDX-License-Identifier: MIT
#include <algorithm>
#include <cmath>

#include "engine/record/record.h"

namespace couplet {
namespace {

std::optional<double> unless_missing(double value) {
  return std::isnan(value) ? std::nullopt : std::optional<double>(value);
}

}  // namespace

RecordReader::RecordReader(const std::string& path) : file_(Hdf5File::open(path)) {
  if (!file_.has("/netlist/text"))
    throw RecordError(path + ": is no record of couplet; give the file that a run has written");
  if (!file_.has("/signals/key")) return;
  const auto names = file_.texts("/signals/name"), units = file_.texts("/signals/unit");
  keys_ = file_.texts("/signals/key");
  for (std::size_t i = 0; i < names.size(); ++i) signals_.push_back({names[i], units[i]});
  std::vector<std::string> full = {"/full/time"}, periods = {"/periods/start", "/periods/duration"};
  for (const auto& key : keys_) {
    full.push_back("/full/" + key);
    for (const char* which : {"minimum/", "maximum/", "mean/"})
      periods.push_back(std::string("/periods/") + which + key);
  }
  full_rows_ = shortest(full);
  period_rows_ = shortest(periods);
}

std::size_t RecordReader::shortest(const std::vector<std::string>& names) const {
  std::size_t rows = names.empty() ? 0 : SIZE_MAX;
  for (const auto& name : names) rows = std::min(rows, file_.has(name) ? file_.rows(name) : 0);
  return rows;
}

std::vector<double> RecordReader::column(const std::string& name, std::size_t rows) const {
  auto values = file_.numbers(name);
  values.resize(rows);
  return values;
}

std::vector<int> RecordReader::indices(const std::string& name, std::size_t rows) const {
  const auto values = column(name, rows);
  return {values.begin(), values.end()};
}

bool RecordReader::finished() const { return file_.has("/program/sentence"); }

RecordReader::Netlist RecordReader::netlist() const {
  return {file_.text("/netlist/file"), file_.text("/netlist/sha256"), file_.text("/netlist/text"),
          file_.text("/netlist/title")};
}

RecordReader::Program RecordReader::program() const {
  Program p;
  p.version = file_.text("/program/version");
  p.options = file_.texts("/program/options");
  if (!finished()) {
    p.sentence = "the run did not end by itself: this is what it had written before";
    return p;
  }
  p.sentence = file_.text("/program/sentence");
  const auto number = [&](const char* name) { return file_.number_attribute("/program", name); };
  p.steps = number("steps"), p.refused = number("refused"), p.events = number("events");
  p.commands = number("commands"), p.corners = number("corners"), p.topologies = number("topologies");
  p.seconds = number("seconds"), p.seconds_building = number("seconds_building");
  return p;
}

int RecordReader::signal(const std::string& name) const {
  for (std::size_t i = 0; i < signals_.size(); ++i) {
    if (signals_[i].name == name) return static_cast<int>(i);
  }
  return -1;
}

std::vector<double> RecordReader::full_time() const {
  return signals_.empty() ? std::vector<double>() : column("/full/time", full_rows_);
}
std::vector<double> RecordReader::full(int signal) const {
  return column("/full/" + keys_.at(signal), full_rows_);
}

std::vector<std::size_t> RecordReader::stretches() const {
  std::vector<std::size_t> rows;
  if (signals_.empty()) return rows;
  for (double row : file_.numbers("/full/stretches")) {
    if (row < static_cast<double>(full_rows_)) rows.push_back(static_cast<std::size_t>(row));
  }
  // A killed run may have held the beginnings back.
  if (rows.empty() && full_rows_ > 0) rows.push_back(0);
  return rows;
}

RecordReader::Periods RecordReader::periods() const {
  if (signals_.empty()) return {};
  return {column("/periods/start", period_rows_), column("/periods/duration", period_rows_)};
}

RecordReader::PeriodValues RecordReader::period_values(int signal) const {
  const std::string& key = keys_.at(signal);
  return {column("/periods/minimum/" + key, period_rows_), column("/periods/maximum/" + key, period_rows_),
          column("/periods/mean/" + key, period_rows_)};
}

RecordReader::Events RecordReader::events() const {
  Events e;
  if (signals_.empty()) return e;
  const std::size_t rows = shortest({"/events/time", "/events/kind", "/events/name", "/events/state"});
  e.kinds = file_.texts("/events/kinds"), e.names = file_.texts("/events/names"),
  e.states = file_.texts("/events/states");
  e.time = column("/events/time", rows);
  e.kind = indices("/events/kind", rows), e.name = indices("/events/name", rows),
  e.state = indices("/events/state", rows);
  return e;
}

RecordReader::Regions RecordReader::regions() const {
  Regions r;
  if (signals_.empty()) return r;
  const std::size_t rows = shortest({"/regions/time", "/regions/branch", "/regions/state"});
  r.branches = file_.texts("/regions/branches"), r.states = file_.texts("/regions/states");
  r.time = column("/regions/time", rows);
  r.branch = indices("/regions/branch", rows), r.state = indices("/regions/state", rows);
  return r;
}

Figures RecordReader::figures() const {
  Figures figures;
  if (!file_.has("/figures/when")) return figures;
  const auto names = file_.texts("/figures/name"), units = file_.texts("/figures/unit");
  const auto values = file_.numbers("/figures/value"), when = file_.numbers("/figures/when");
  for (std::size_t i = 0; i < names.size(); ++i)
    figures.set(names[i], values[i], units[i], unless_missing(when[i]));
  return figures;
}

std::vector<Verdict> RecordReader::verdicts() const {
  std::vector<Verdict> verdicts;
  if (!file_.has("/verdicts/when")) return verdicts;
  const auto names = file_.texts("/verdicts/name"), figures = file_.texts("/verdicts/figure"),
             units = file_.texts("/verdicts/unit");
  const auto status = file_.texts("/verdicts/status"), why = file_.texts("/verdicts/why"),
             source = file_.texts("/verdicts/source");
  const auto value = file_.numbers("/verdicts/value"), at_least = file_.numbers("/verdicts/at_least");
  const auto at_most = file_.numbers("/verdicts/at_most"), margin = file_.numbers("/verdicts/margin");
  const auto percent = file_.numbers("/verdicts/margin_percent"), when = file_.numbers("/verdicts/when");
  for (std::size_t i = 0; i < names.size(); ++i) {
    Verdict v;
    v.name = names[i], v.figure = figures[i], v.unit = units[i], v.why = why[i], v.source = source[i];
    for (auto s : {Verdict::Status::met, Verdict::Status::not_met, Verdict::Status::not_judged}) {
      if (status_word(s) == status[i]) v.status = s;
    }
    v.value = value[i], v.margin = margin[i], v.margin_percent = percent[i];
    v.at_least = unless_missing(at_least[i]), v.at_most = unless_missing(at_most[i]),
    v.when = unless_missing(when[i]);
    verdicts.push_back(std::move(v));
  }
  return verdicts;
}

}  // namespace couplet
