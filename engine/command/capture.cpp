// SPDX-License-Identifier: MIT
// `couplet capture`: bench captures and readings to part values, or a capture laid over a record.
#include <fmt/format.h>

#include <cmath>
#include <filesystem>
#include <map>
#include <numbers>

#include "engine/capture/coupling.h"
#include "engine/capture/csv.h"
#include "engine/capture/inductance.h"
#include "engine/capture/overlay.h"
#include "engine/capture/ringdown.h"
#include "engine/command/commands.h"
#include "engine/quantity/quantity.h"
#include "engine/record/record.h"

namespace couplet {
namespace {

using namespace capture;

/// A computation that ended without an answer: its message, for status 3.
struct NoAnswer {
  std::string text;
};

double number(const std::string& option, const std::string& text, const std::string& unit) {
  const ReadQuantity read = read_quantity(text, unit);
  if (!read.problem.empty()) throw InputError(fmt::format("--{}: {}", option, read.problem));
  return read.value;
}

/// "47 nF +- 2 %", "12 pF +- 3 pF", "50 mohm".
Stated given(const std::string& option, const std::string& text, const std::string& unit) {
  if (text.empty()) return {};
  const std::size_t mark = text.find("+-");
  Stated value{number(option, text.substr(0, mark), unit), 0};
  if (mark == std::string::npos) return value;
  const std::string spread = text.substr(mark + 2);
  value.tolerance = spread.find('%') != std::string::npos
                        ? std::abs(value.value) * number(option, spread, "1")
                        : number(option, spread, unit);
  return value;
}

std::pair<std::string, std::string> name_and_value(const std::string& option, const std::string& text) {
  const std::size_t mark = text.find('=');
  if (mark == std::string::npos) throw InputError(fmt::format("--{} {}: write NAME=VALUE", option, text));
  return {text.substr(0, mark), text.substr(mark + 1)};
}

CsvOptions csv_options(const CaptureCommand& options) {
  CsvOptions csv{options.time_unit, options.unit, {}};
  for (const std::string& probe : options.probe) {
    const bool named = probe.find('=') != std::string::npos;
    const auto [name, factor] =
        named ? name_and_value("probe", probe) : std::pair<std::string, std::string>{"", probe};
    const double value = number("probe", factor, "1");
    if (!(value > 0)) throw InputError(fmt::format("--probe {}: the factor must be above zero", probe));
    csv.probe[name] = value;
  }
  return csv;
}

struct Trace {
  Capture file;
  std::size_t channel = 0;
  const Channel& values() const { return file.channels[channel]; }
};

Trace read_trace(const std::string& path, const CaptureCommand& options) {
  const CsvReading reading = read_csv_file(path, csv_options(options));
  if (!reading) throw InputError(reading.refusal);
  Trace trace{reading.capture};
  const auto& channels = trace.file.channels;
  if (options.channel.empty() && channels.size() == 1) return trace;
  std::string names;
  for (std::size_t i = 0; i < channels.size(); ++i) {
    if (channels[i].name == options.channel) return trace.channel = i, trace;
    names += (i == 0 ? "" : ", ") + channels[i].name;
  }
  throw InputError(fmt::format("{}: {}; say --channel with one of: {}", path,
                               options.channel.empty() ? "several channels" : "no channel " + options.channel,
                               names));
}

void print_notes(const std::vector<std::string>& notes) {
  for (const std::string& note : notes) fmt::print("  - {}\n", note);
}

/// Collects figures and, unless quiet, prints a line for each.
class Table {
 public:
  explicit Table(bool print) : print_(print) {}
  bool prints() const { return print_; }
  void head(const std::string& text) const {
    if (print_) fmt::print("{}\n", text);
  }
  void plain(const std::string& name, double value, const std::string& unit) {
    figures.set(name, value, unit);
    line(name, value, unit, "");
  }
  void estimate(const std::string& name, const Estimate& e, const std::string& unit) {
    figures.set(name, e.value, unit);
    figures.set(name + ".low", e.low, unit);
    figures.set(name + ".high", e.high, unit);
    line(name, e.value, unit, "+- " + print_quantity((e.high - e.low) / 2, unit, 3) + " (95 %)");
  }
  void part(const std::string& name, const PartValue& p, const std::string& unit) {
    estimate(name, p.statistical, unit);
    if (p.systematic.low == p.systematic.high) return;
    figures.set(name + ".tolerance.low", p.systematic.low, unit);
    figures.set(name + ".tolerance.high", p.systematic.high, unit);
    line("", NAN, unit,
         fmt::format("tolerances: {} to {}", show(p.systematic.low, unit), show(p.systematic.high, unit)));
  }
  Figures figures;

 private:
  static std::string show(double value, const std::string& unit) { return print_quantity(value, unit, 6); }
  void line(const std::string& name, double value, const std::string& unit, const std::string& range) const {
    if (print_) fmt::print("  {:<26}{:>16}   {}\n", name, std::isnan(value) ? "" : show(value, unit), range);
  }
  bool print_;
};

RingDown ring_of(const Trace& trace, const CaptureCommand& options, const std::string& prefix, Table& table) {
  RingDownOptions fit_options;
  fit_options.modes = options.modes;
  if (!options.from.empty()) fit_options.start = number("from", options.from, "s");
  if (!options.to.empty()) fit_options.end = number("to", options.to, "s");
  const RingDown ring = fit_ring_down(trace.file.time, trace.values().values, fit_options);
  if (table.prints()) {
    fmt::print("{}, {}: {} samples, {}\n", trace.file.file, trace.values().name, trace.file.time.size(),
               print_quantity(trace.file.time.back() - trace.file.time.front(), "s", 4));
    print_notes(trace.file.notes);
    print_notes(ring.notes);
  }
  if (!ring.usable) throw NoAnswer{fmt::format("{}: no ring-down to use: {}", trace.file.file, ring.reason)};
  table.head(fmt::format("Ring-down from {} to {}: {} samples, {} outliers left out, rest {} rms",
                         print_quantity(ring.start, "s", 5), print_quantity(ring.end, "s", 5), ring.used,
                         ring.outliers, print_quantity(ring.noise, trace.values().unit, 3)));
  for (std::size_t i = 0; i < ring.modes.size(); ++i) {
    const std::string name = prefix + (ring.modes.size() > 1 ? fmt::format("{}.", i + 1) : "");
    table.estimate(name + "frequency", ring.modes[i].frequency, "Hz");
    table.estimate(name + "damping", ring.modes[i].damping, "1/s");
    table.estimate(name + "quality", ring.modes[i].quality, "1");
    table.plain(name + "amplitude", ring.modes[i].amplitude, trace.values().unit);
  }
  return ring;
}

void part_values(const CaptureCommand& options, Table& table) {
  const RingDown ring = ring_of(read_trace(options.file, options), options, "ring.", table);
  if (options.capacitor.empty()) {
    if (!options.closed.empty())
      throw InputError("--closed needs --capacitor, like --capacitor \"47 nF +- 2 %\"");
    return;
  }
  if (ring.modes.size() != 1) throw InputError("--capacitor needs a ring-down of one mode");
  KnownCapacitor capacitor{given("capacitor", options.capacitor, "F"),
                           given("probe-capacitance", options.probe_capacitance, "F"),
                           given("series-resistance", options.series_resistance, "ohm"), 0};
  if (!options.probe_resistance.empty()) {
    capacitor.probe_resistance = number("probe-resistance", options.probe_resistance, "ohm");
  }
  const CoilReading coil = read_coil(ring.modes.front(), capacitor);
  if (!coil.problem.empty()) throw NoAnswer{coil.problem};
  table.head("Coil");
  table.part("coil.inductance", coil.inductance, "H");
  table.part("coil.resistance", coil.resistance, "ohm");
  table.part("coil.quality", coil.quality, "1");
  if (options.closed.empty()) return;
  const RingDown closed = ring_of(read_trace(options.closed, options), options, "closed.", table);
  const CouplingReading pair = read_coupling(ring.modes.front(), closed.modes.front(), capacitor);
  if (!pair.problem.empty()) throw NoAnswer{pair.problem};
  table.head("Coupling to the closed coil");
  table.part("coupling", pair.coupling, "1");
  table.part("reflected.resistance", pair.reflected_resistance, "ohm");
  table.plain("reflected.inductance", pair.reflected_inductance, "H");
}

void overlay_on_record(const CaptureCommand& options, Table& table) {
  const Trace trace = read_trace(options.file, options);
  const RecordReader record(options.against);
  const int signal = record.signal(options.signal);
  if (signal < 0) {
    std::string names;
    for (const Signal& known : record.signals()) names += (names.empty() ? "" : ", ") + known.name;
    throw InputError(fmt::format("{}: no signal \"{}\"; say --signal with one of: {}", options.against,
                                 options.signal, names));
  }
  const std::string& unit = record.signals()[static_cast<std::size_t>(signal)].unit;
  if (unit != trace.values().unit) {
    throw InputError(
        fmt::format("{} is in {}, the signal in {}", trace.values().name, trace.values().unit, unit));
  }
  // Rows at one time are the two sides of a jump; an overlay needs one of them.
  const std::vector<double> time = record.full_time();
  const std::vector<double> values = record.full(signal);
  capture::Waveform computed;
  for (std::size_t i = 0; i < time.size(); ++i) {
    if (i + 1 < time.size() && time[i + 1] <= time[i]) continue;
    computed.time.push_back(time[i]);
    computed.value.push_back(values[i]);
  }
  OverlayOptions overlay_options{{}, options.offset};
  if (!options.shift.empty()) overlay_options.shift = number("shift", options.shift, "s");
  const Overlay result = overlay({trace.file.time, trace.values().values}, computed, overlay_options);
  if (!result.usable) throw NoAnswer{result.reason};
  table.head(fmt::format("{}, {} over {}, {}: {} samples from {} to {}", trace.file.file, trace.values().name,
                         options.against, options.signal, result.samples,
                         print_quantity(result.begin, "s", 5), print_quantity(result.end, "s", 5)));
  if (table.prints()) print_notes(trace.file.notes), print_notes(result.notes);
  table.plain("overlay.shift", result.shift, "s");
  if (options.offset) table.plain("overlay.offset", result.offset, unit);
  table.plain("overlay.amplitude.ratio", result.amplitude_ratio, "1");
  table.plain("overlay.frequency.ratio", result.frequency_ratio, "1");
  table.plain("overlay.phase", result.phase * std::numbers::pi / 180, "rad");
  table.plain("overlay.rms", result.rms, unit);
  table.plain("overlay.rms.relative", result.relative_rms, "1");
  table.plain("overlay.worst", result.worst, unit);
  table.plain("overlay.worst.time", result.worst_at, "s");
}

/// Readings by name, each used at most once by each method.
class Readings {
 public:
  explicit Readings(const std::vector<std::string>& texts) {
    static const std::map<std::string, std::string> units{
        {"open", "H"},          {"short", "H"},         {"aiding", "H"},        {"opposing", "H"},
        {"first", "H"},         {"second", "H"},        {"first-voltage", "V"}, {"second-voltage", "V"},
        {"low", "Hz"},          {"high", "Hz"},         {"first-alone", "Hz"},  {"second-alone", "Hz"},
        {"first-quality", "1"}, {"second-quality", "1"}};
    for (const std::string& text : texts) {
      const auto [name, value] = name_and_value("reading", text);
      const auto unit = units.find(name);
      if (unit == units.end()) {
        std::string names;
        for (const auto& known : units) names += (names.empty() ? "" : ", ") + known.first;
        throw InputError(fmt::format("--reading {}: no reading of that name; known: {}", name, names));
      }
      const Stated read = given("reading " + name, value, unit->second);
      held_[name] = {read.value, read.value != 0 ? read.tolerance / std::abs(read.value) : 0};
    }
  }
  bool has(std::initializer_list<const char*> names) const {
    for (const char* name : names) {
      if (held_.count(name) == 0) return false;
    }
    return true;
  }
  Reading operator[](const char* name) const {
    const auto found = held_.find(name);
    return found == held_.end() ? Reading{} : found->second;
  }

 private:
  std::map<std::string, Reading> held_;
};

void coupling_of_readings(const CaptureCommand& options, Table& table) {
  const Readings r(options.readings);
  std::vector<CouplingFactor> answers;
  std::vector<std::string> names;
  const auto add = [&](const char* name, CouplingFactor answer) {
    names.emplace_back(name);
    answers.push_back(std::move(answer));
  };
  if (r.has({"open", "short"})) {
    add("open-short", open_short({r["open"], r["short"], r["second-quality"].value}));
  }
  if (r.has({"aiding", "opposing", "first", "second"})) {
    add("aiding-opposing", aiding_opposing({r["aiding"], r["opposing"], r["first"], r["second"]}));
  }
  if (r.has({"first-voltage", "second-voltage", "first", "second"})) {
    add("voltage-ratio", voltage_ratio({r["first-voltage"], r["second-voltage"], r["first"], r["second"]}));
  }
  if (r.has({"low", "high", "first-alone", "second-alone"})) {
    add("split", split_resonances({r["low"], r["high"], r["first-alone"], r["second-alone"],
                                   r["first-quality"].value, r["second-quality"].value}));
  }
  if (answers.empty()) {
    throw InputError(
        "the readings make up no method; give open and short; or aiding, opposing, first and second; or "
        "first-voltage, second-voltage, first and second; or low, high, first-alone and second-alone");
  }
  table.head("Coupling factor from readings (errors as stated, first order)");
  for (std::size_t i = 0; i < answers.size(); ++i) {
    const CouplingFactor& answer = answers[i];
    if (!answer.problem.empty()) {
      table.head(fmt::format("  {}: {}", answer.method, answer.problem));
      continue;
    }
    table.figures.set("coupling." + names[i], answer.k, "1");
    table.figures.set("coupling." + names[i] + ".error", answer.error, "1");
    table.head(fmt::format("  {:<20}{:>10.5f} +- {:.5f}  ({:.2g} %)", answer.method, answer.k, answer.error,
                           100 * answer.error / answer.k));
    if (table.prints()) {
      for (const std::string& warning : answer.warnings) fmt::print("      {}\n", warning);
    }
  }
  if (r.has({"aiding", "opposing", "first", "second"})) {
    const Consistency check = check_inductances({r["aiding"], r["opposing"], r["first"], r["second"]});
    table.figures.set("coupling.consistency", check.miss, "1");
    table.head("  " + check.sentence);
  }
  const Choice choice = choose(answers);
  if (!answers[choice.best].problem.empty()) throw NoAnswer{choice.sentence};
  table.figures.set("coupling", answers[choice.best].k, "1");
  table.head("  " + choice.sentence);
  std::string plan;
  const CouplingFactor& best = answers[choice.best];
  if (r["first"].value > 0 && r["second"].value > 0 && best.k > 0 && best.k < 1) {
    for (const Plan& it : plan_methods(best.k, r["first"].value, r["second"].value, r["first"].error,
                                       r.has({"first-voltage"}) ? r["first-voltage"].error : 0.01,
                                       r.has({"low"}) ? r["low"].error : 1e-3)) {
      plan += fmt::format("{}{} {:.2g} %", plan.empty() ? "" : ", ", it.method, 100 * it.relative_error);
    }
    table.head("  At this coupling the methods would be good to: " + plan);
  }
}

}  // namespace

int capture_command(const CaptureCommand& options) {
  if (!options.force && !options.json.empty() && options.json != "-" &&
      std::filesystem::exists(options.json)) {
    throw InputError(fmt::format("{}: exists already; give --force to overwrite it", options.json));
  }
  if (options.file.empty() && options.readings.empty()) {
    throw InputError("give a capture (a CSV file), or readings like --reading open=\"24 uH +- 1 %\"");
  }
  if (options.against.empty() != options.signal.empty()) {
    throw InputError("--against and --signal go together: the record, and the signal in it");
  }
  Table table(!options.quiet && options.json != "-");
  int status = status_met;
  try {
    if (!options.readings.empty()) coupling_of_readings(options, table);
    if (!options.against.empty()) {
      overlay_on_record(options, table);
    } else if (!options.file.empty()) {
      part_values(options, table);
    }
  } catch (const NoAnswer& none) {
    // What was found before stays and is written.
    fmt::print(stderr, "{}\n", none.text);
    status = status_unfinished;
  }
  if (!options.json.empty()) {
    Design named;
    named.title = options.file;
    write_text(options.json, json_of(named, "capture", status, table.figures, {}));
  }
  return status;
}

}  // namespace couplet
