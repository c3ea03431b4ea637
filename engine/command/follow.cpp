// SPDX-License-Identifier: MIT
#include <fmt/format.h>

#include "engine/command/commands.h"
#include "engine/command/plots.h"
#include "engine/quantity/quantity.h"
#include "engine/study/follow.h"

namespace couplet {
namespace {

double value_of(const Design& design, const std::string& name, const std::string& text, const char* option) {
  const Quantity q = design.get(name);
  if (q.unit.empty()) throw InputError(fmt::format("{} is given, but no part uses it", name));
  const ReadQuantity read = read_quantity(text, q.unit);
  if (!read.problem.empty()) throw InputError(fmt::format("{}: {}", option, read.problem));
  return read.value;
}

constexpr const char* columns[] = {"frequency", "rail.mean", "regulator.headroom", "efficiency", "supply.power", "load.power"};

std::string path_json(const Path& path) {
  Json json;
  json.key("path").open('{').key("along").value(path.along).key("unit").value(path.unit).key("sentence").value(path.sentence).key("points").open('[');
  for (const auto& p : path.points) {
    json.open('{').key("value").value(p.value).key("stable").value(p.stable);
    json.key("multiplier").open('[').value(p.multiplier.real()).value(p.multiplier.imag()).close(']').key("figures").open('{');
    for (const auto& f : p.figures.all()) json.key(f.name).value(f.value);
    json.close('}').close('}');
  }
  json.close(']').key("marks").open('[');
  for (const auto& m : path.marks) json.open('{').key("value").value(m.value).key("frequency").value(m.frequency).key("words").value(m.words).close('}');
  json.close(']').close('}');
  return json.text();
}

}  // namespace

int follow_command(const FollowCommand& options) {
  const Design design = read_netlist(options.common.netlist, options.common.set);
  FollowOptions follow_options;
  follow_options.along = options.along;
  follow_options.from = value_of(design, options.along, options.from, "--from");
  follow_options.to = value_of(design, options.along, options.to, "--to");
  Path path;
  {
    Progress progress(options.common.quiet);
    follow_options.progress = [&](double share) { progress(share); };
    path = follow(design, follow_options);
  }
  const int status = path.points.empty() ? status_unfinished : status_met;
  if (!options.common.quiet && options.common.json != "-") {
    fmt::print("{}\nAlong {}: {} points, {} steps refused and taken shorter, {:.2f} s; {}\n\n", design.title, path.along, path.points.size(), path.refused, path.seconds, path.sentence);
    fmt::print("  {:>12}", path.along);
    std::vector<const char*> shown;
    for (const char* c : columns) {
      if (!path.points.empty() && path.points.front().figures.find(c)) shown.push_back(c), fmt::print("  {:>18}", c);
    }
    fmt::print("  stable\n");
    const std::size_t every = options.common.verbose ? 1 : std::max<std::size_t>(1, path.points.size() / 30);
    for (std::size_t i = 0; i < path.points.size(); ++i) {
      if (i % every != 0 && i + 1 != path.points.size()) continue;
      const auto& p = path.points[i];
      fmt::print("  {:>12}", print_quantity(p.value, path.unit, 5));
      for (const char* c : shown) {
        const Figure* f = p.figures.find(c);
        fmt::print("  {:>18}", print_quantity(f->value, f->unit, 6));
      }
      fmt::print("  {}\n", p.stable ? "yes" : "no");
    }
    for (const auto& m : path.marks) fmt::print("\n  at {} = {} ({}): {}\n", path.along, print_quantity(m.value, path.unit, 8), print_quantity(m.frequency, "Hz", 6), m.words);
  }
  if (!path.points.empty() && !options.common.plot.empty()) write_text(options.common.plot, plot_path(path, design));
  if (!options.common.json.empty()) write_text(options.common.json, json_of(design, "follow", status, path.points.empty() ? Figures{} : path.points.back().figures, {}, path_json(path)));
  if (path.points.empty()) fmt::print(stderr, "{}: {}\n", design.file, path.sentence);
  return status;
}

}  // namespace couplet
