// SPDX-License-Identifier: MIT
#include <fmt/format.h>

#include <cmath>

#include "engine/command/commands.h"
#include "engine/command/plots.h"
#include "engine/quantity/quantity.h"
#include "engine/study/steady_state.h"

namespace couplet {
namespace {

std::string outcome_of(const SteadyState& s) {
  if (s.orbit.kind == Orbit::Kind::rest) return s.orbit.sentence;
  if (!s.orbit.found()) return "no settled state: " + s.orbit.sentence;
  const double f = s.figures.value("frequency");
  return fmt::format("settles at {}{}", print_quantity(f, "Hz", 7), s.orbit.returns > 1 ? fmt::format(" on average, repeating after {} returns only", s.orbit.returns) : "");
}

std::string details_json(const SteadyState& s) {
  Json json;
  json.key("outcome").value(outcome_of(s)).key("section").value(s.section.words);
  json.key("orbit").open('{').key("sentence").value(s.orbit.sentence).key("period").value(s.orbit.period).key("returns").value(static_cast<long>(s.orbit.returns));
  json.key("laps").value(s.orbit.laps).key("seconds").value(s.orbit.seconds).key("residuals").open('[');
  for (double r : s.orbit.residuals) json.value(r);
  json.close(']').key("multipliers").open('[');
  for (const auto& m : s.orbit.multipliers) json.open('[').value(m.real()).value(m.imag()).close(']');
  json.close(']').key("notes").open('[');
  for (const auto& n : s.orbit.notes) json.value(n);
  json.close(']').close('}');
  json.key("harmonics").open('[');
  for (const auto& h : s.harmonics) {
    json.open('{').key("quantity").value(h.quantity).key("order").value(static_cast<long>(h.order)).key("frequency").value(h.frequency).key("amplitude").value(h.amplitude).close('}');
  }
  json.close(']').key("timeline").open('[');
  for (const auto& t : s.timeline) {
    const Branch& b = s.bench->circuit.sheet().branches[t.branch];
    json.open('{').key("part").value(b.name).key("state").value(b.cells[t.cell].state).key("from").value(t.from - s.bench->lapper.base()).key("to").value(t.to - s.bench->lapper.base()).close('}');
  }
  json.close(']');
  return json.text();
}

void print_timeline(const SteadyState& s) {
  fmt::print("\nWhat conducts when (from the section, one period)\n");
  constexpr int width = 64;
  const auto& branches = s.bench->circuit.sheet().branches;
  int last = -1;
  std::string row;
  const auto flush = [&] {
    if (last >= 0) fmt::print("  {:<28}|{}|\n", branches[last].name, row);
  };
  for (const auto& t : s.timeline) {
    if (t.branch != last) {
      flush();
      last = t.branch;
      row.assign(width, ' ');
    }
    const int from = static_cast<int>((t.from - s.bench->lapper.base()) / s.orbit.period * width), to = static_cast<int>(std::ceil((t.to - s.bench->lapper.base()) / s.orbit.period * width));
    const std::string& state = branches[t.branch].cells[t.cell].state;
    const bool idle = state == "off" || state == "blocks" || state == "open" || state == "idle";
    const char mark = idle ? '.' : state == "saturated" ? '~' : '#';
    for (int i = std::max(from, 0); i < std::min(to, width); ++i) row[i] = row[i] == ' ' || row[i] == '.' ? mark : row[i];
  }
  flush();
  fmt::print("  {:<28} # conducts, ~ saturated, . blocks\n", "");
}

}  // namespace

int settle_command(const SettleCommand& options) {
  const Design design = read_netlist(options.common.netlist, options.common.set);
  SteadyState s = run_settle(design);
  const bool answer = s.orbit.found();
  const int status = !answer ? (s.orbit.kind == Orbit::Kind::rest ? status_not_met : status_unfinished) : all_met(s.verdicts) ? status_met : status_not_met;
  if (!options.common.quiet && options.common.json != "-") {
    fmt::print("{}\n{}\n", design.title.empty() ? design.file : design.title, outcome_of(s));
    if (!s.section.words.empty()) fmt::print("Section: {}\n", s.section.words);
    for (const auto& n : s.orbit.notes) fmt::print("Note: {}\n", n);
    if (answer) {
      fmt::print("\nFigures of one exact period\n{}", figure_table(s.figures, false));
      fmt::print("\nWhere the power goes\n{}", loss_table(s.figures, s.bench->circuit.sheet()));
      print_timeline(s);
    }
    if (!s.verdicts.empty()) fmt::print("\nVerdicts, worst first\n{}", verdict_table(s.verdicts, options.common.verbose));
    if (options.common.verbose) {
      fmt::print("\nFigures of each part\n{}", figure_table(s.figures, true));
      fmt::print("\nFound how: {}; {} laps, {:.2f} ms, figures {:.2f} ms\n", s.orbit.sentence, s.orbit.laps, 1e3 * s.orbit.seconds, 1e3 * s.seconds_figures);
    }
  }
  if (answer && !options.common.plot.empty()) write_text(options.common.plot, plot_settle(s, design));
  if (!options.common.json.empty()) write_text(options.common.json, json_of(design, "settle", status, s.figures, s.verdicts, details_json(s)));
  if (!answer) fmt::print(stderr, "{}: {}\n", design.file, outcome_of(s));
  return status;
}

}  // namespace couplet
