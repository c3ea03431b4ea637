// SPDX-License-Identifier: MIT
#include <fmt/format.h>

#include "engine/command/commands.h"
#include "engine/quantity/quantity.h"
#include "engine/command/plots.h"
#include "engine/record/recorder.h"
#include "engine/study/start.h"
#include "engine/study/steady_state.h"

namespace couplet {
namespace {

std::string report_json(const StartResult& r) {
  Json json;
  json.key("outcome").value(r.outcome);
  json.key("march").open('{').key("sentence").value(r.report.sentence).key("steps").value(r.report.steps).key("refused").value(r.report.refused);
  json.key("events").value(r.report.events).key("commands").value(r.report.commands).key("topologies").value(static_cast<long>(r.report.topologies));
  json.key("seconds").value(r.report.seconds).key("seconds_building").value(r.report.seconds_building).close('}');
  json.key("window").open('{').key("from").value(r.window_from).key("to").value(r.window_to).key("periods").value(r.window_periods).close('}');
  json.key("ledger").open('{').key("supplied").value(r.ledger.supplied).key("dissipated").value(r.ledger.dissipated).key("to_loads").value(r.ledger.to_loads);
  json.key("stored_change").value(r.ledger.stored_change).key("scheduled").value(r.ledger.scheduled).key("residual").value(r.ledger.residual).close('}');
  json.key("notes").open('[');
  for (const auto& n : r.notes) json.value(n);
  json.close(']');
  return json.text();
}

void print_summary(const Design& design, const StartResult& r, const CommonOptions& common) {
  fmt::print("{}\n{}\n\n", design.title.empty() ? design.file : design.title, r.outcome);
  if (r.window_periods > 0) {
    fmt::print("Figures of the last {} periods ({} to {})\n", r.window_periods, print_quantity(r.window_from, "s", 6), print_quantity(r.window_to, "s", 6));
  } else {
    fmt::print("Figures of the last stretch ({} to {})\n", print_quantity(r.window_from, "s", 6), print_quantity(r.window_to, "s", 6));
  }
  fmt::print("{}", figure_table(r.figures, false));
  fmt::print("\nWhere the power goes\n{}", loss_table(r.figures, r.sheet));
  fmt::print("\nEnergy over the whole march: supplied {}, lost {}, to the load {}, stored {}; closes to {:.1e}\n", print_quantity(r.ledger.supplied, "J"),
             print_quantity(r.ledger.dissipated, "J"), print_quantity(r.ledger.to_loads, "J"), print_quantity(r.ledger.stored_change, "J"), r.ledger.relative());
  if (!r.verdicts.empty()) fmt::print("\nVerdicts, worst first\n{}", verdict_table(r.verdicts, common.verbose));
  for (const auto& note : r.notes) fmt::print("\nNote: {}\n", note);
  if (common.verbose) {
    fmt::print("\nFigures of each part\n{}", figure_table(r.figures, true));
    fmt::print("\nMarch: {}; {} steps, {} tried again shorter, {} events, {} commands, {} topologies; {:.3f} s, of which {:.3f} s building\n", r.report.sentence,
               r.report.steps, r.report.refused, r.report.events, r.report.commands, r.report.topologies, r.report.seconds, r.report.seconds_building);
  }
}

/// Hands everything to a recorder that is made only once the circuit stands.
class Fork : public Observer {
 public:
  void span(const Span& span) override {
    if (to) to->span(span);
  }
  void event(const Event& event) override {
    if (to) to->event(event);
  }
  Observer* to = nullptr;
};

std::vector<std::string> words_of(const StartCommand& options) {
  std::vector<std::string> words = {"start", options.common.netlist, "--march", options.common.march};
  for (const auto& s : options.common.set) words.insert(words.end(), {"--set", s});
  if (!options.duration.empty()) words.insert(words.end(), {"--duration", options.duration});
  words.insert(words.end(), {"--record", options.record});
  return words;
}

}  // namespace

int start_command(const StartCommand& options) {
  const Design design = read_netlist(options.common.netlist, options.common.set);
  if (!options.common.plot.empty() && options.common.out.empty()) throw InputError("--plot of a start is drawn from its record; give --out PATH too");
  StartOptions start;
  start.ida = options.common.march == "ida";
  start.march.relative = options.tolerance;
  if (!options.duration.empty()) {
    const ReadQuantity d = read_quantity(options.duration, "s");
    if (!d.problem.empty() || d.value <= 0) throw InputError("--duration: " + (d.problem.empty() ? "must be positive" : d.problem));
    start.duration = d.value;
  }
  // The record wants to know what a period is before the march begins.
  start.section = section_of(design);
  std::unique_ptr<RecordWriter> writer;
  std::unique_ptr<Recorder> recorder;
  Fork fork;
  if (!options.common.out.empty()) {
    writer = std::make_unique<RecordWriter>(options.common.out, design, words_of(options), COUPLET_VERSION, options.common.force);
    RecorderSettings settings;
    settings.all = options.record == "all";
    settings.points = design.run.points_per_period.value_or(64);
    settings.signals = design.run.record;
    settings.probe = start.section.driven || !start.section.problem.empty() ? -1 : 0;
    start.on_circuit = [&, settings](const Circuit& circuit, double time) mutable {
      if (recorder) {
        recorder->follow(circuit);
        return;
      }
      settings.period = start.section.driven ? start.section.period : natural_period(circuit);
      recorder = std::make_unique<Recorder>(circuit, *writer, settings);
      for (const auto& entry : design.schedule) {
        if (entry.time.value > time) recorder->mark(entry.time.value);
      }
      fork.to = recorder.get();
    };
    start.observers.push_back(&fork);
    start.on_end = [&](const StartResult& r) {
      if (recorder) recorder->finish();
      writer->figures(r.figures);
      writer->verdicts(r.verdicts);
      writer->report(r.report);
      writer->close();
    };
  }
  StartResult result;
  {
    Progress progress(options.common.quiet);
    start.progress = [&](double share) { progress(share); };
    result = run_start(design, start);
  }
  const int status = !result.report.usable() ? status_unfinished : all_met(result.verdicts) ? status_met : status_not_met;
  if (!options.common.quiet && options.common.json != "-") print_summary(design, result, options.common);
  if (!options.common.json.empty()) write_text(options.common.json, json_of(design, "start", status, result.figures, result.verdicts, report_json(result)));
  if (!options.common.plot.empty()) write_text(options.common.plot, plot_start(RecordReader(options.common.out), design));
  if (writer && !options.common.quiet && options.common.json != "-") fmt::print("\nRecord: {}\n", options.common.out);
  if (!result.report.usable()) fmt::print(stderr, "{}: {}\n", design.file, result.report.sentence);
  return status;
}

}  // namespace couplet
