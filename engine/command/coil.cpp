// SPDX-License-Identifier: MIT
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>

#include "engine/command/coil_plot.h"
#include "engine/command/commands.h"
#include "engine/netlist/coil_file.h"
#include "engine/quantity/quantity.h"
#include "models/coil/field.h"
#include "models/coil/ladder.h"
#include "models/coil/link.h"
#include "models/coil/self.h"

namespace couplet {
namespace {

using coil::Coil;
using coil::LinkValues;
using coil::PositionTable;

/// Everything the command found out; each part may be absent.
struct Answer {
  LinkValues values;
  std::optional<PositionTable> map;
  std::vector<coil::FieldAt> fields;
  std::optional<coil::Ladder> first_ladder, second_ladder;
  std::vector<double> gaps;  // for the factor asked for
};

std::string quantity(double value, const char* unit) { return print_quantity(value, unit, 4); }

/// Breaks a long sentence into lines of at most 100 characters, the later ones indented.
std::string wrapped(const std::string& text, const std::string& first, const std::string& later) {
  std::string out = first;
  size_t length = first.size();
  for (size_t from = 0; from < text.size();) {
    const size_t space = std::min(text.find(' ', from), text.size());
    const bool fresh = from == 0;
    if (!fresh && length + 1 + space - from > 100)
      out += "\n" + later, length = later.size();
    else if (!fresh)
      out += " ", ++length;
    out += text.substr(from, space - from), length += space - from;
    from = space + 1;
  }
  return out;
}

/// Geometry that cannot be is the file's fault: name the file.
template <class Work>
auto blame(const CoilFile& file, const Work& work) {
  try {
    return work();
  } catch (const std::invalid_argument& error) {
    throw InputError(fmt::format("{}: {}", file.file, error.what()));
  } catch (const std::out_of_range& error) {
    throw InputError(fmt::format("{}: {}", file.file, error.what()));
  }
}

LinkValues lone_values(const CoilFile& file) {
  const Coil one = coil::build(file.first);
  coil::Surroundings own;
  own.behind_first = file.sheets.behind_first;
  const coil::Resistance resistance(one, coil::images(own, one, one, {}, 1));
  const coil::Impedance z = resistance.at(file.frequency, file.temperature);
  LinkValues v;
  v.first = coil::self_inductance(one, own.behind_first).value + z.inductance_change;
  v.first_resistance = z.resistance, v.first_resistance_dc = resistance.dc(file.temperature);
  v.notes = coil::validity(own, one, one, 0);
  for (const auto& note : resistance.limits(file.frequency, file.temperature)) v.notes.push_back(note);
  return v;
}

coil::Ladder ladder_of(const CoilFile& file, const coil::Winding& winding,
                       const std::optional<coil::Plane>& behind, double inductance) {
  const Coil one = coil::build(winding);
  coil::Surroundings own;
  own.behind_first = behind;
  const coil::Resistance resistance(one, coil::images(own, one, one, {}, 1));
  const double even = inductance - resistance.at(file.frequency, file.temperature).inductance_change;
  std::vector<coil::Sample> samples{{0, resistance.dc(file.temperature), 0}};
  for (const double f : coil::band(file.ladder->low, file.ladder->high)) {
    const coil::Impedance z = resistance.at(f, file.temperature);
    samples.push_back({f, z.resistance, even + z.inductance_change});
  }
  return coil::fit_ladder(samples, file.ladder->deviation);
}

std::vector<coil::FieldAt> fields_of(const CoilFile& file) {
  coil::Scene scene;
  scene.first = coil::build(file.first);
  scene.second = file.second ? coil::build(*file.second) : scene.first;
  scene.second_in_first = file.second ? coil::pose(scene.first, scene.second, file.place) : coil::Pose{};
  scene.surroundings = file.sheets;
  const double second = file.second ? file.field->second_current : 0;
  const coil::CurrentLine line{file.frequency, file.field->first_current,
                               std::polar(second, file.field->phase)};
  std::vector<coil::FieldAt> list;
  for (const double d : file.field->distances) list.push_back(coil::largest_field(scene, {line}, d));
  return list;
}

/// The map asked for in the file, or one along the gap alone where only a gap is wanted.
std::optional<PositionTable> map_of(const CoilFile& file, bool gap_wanted) {
  if (!file.second || (file.gaps.empty() && !gap_wanted)) return {};
  std::vector<double> gaps = file.gaps, shifts = file.shifts;
  const double reach = coil::build(*file.second).reach;
  if (gaps.empty())
    for (const double g : coil::band(0.02 * reach, 4 * reach, 40)) gaps.push_back(g);
  if (shifts.empty()) shifts = {file.place.shift};
  return PositionTable(coil::tabulate({file.first, *file.second, file.place, file.sheets}, gaps, shifts,
                                      {file.place.tilt}, file.frequency, file.temperature));
}

Answer work_out(const CoilFile& file, std::optional<double> factor) {
  Answer a;
  if (file.second) {
    a.values = coil::link_values({file.first, *file.second, file.place, file.sheets}, file.frequency,
                                 file.temperature);
    a.map = map_of(file, factor.has_value());
  } else {
    a.values = lone_values(file);
  }
  if (factor && a.map) {
    const auto& shifts = a.map->shifts();
    const double shift = std::clamp(file.place.shift, shifts.front(), shifts.back());
    a.gaps = a.map->gaps_for(*factor, shift, file.place.tilt);
  }
  if (file.field) a.fields = fields_of(file);
  if (file.ladder) {
    a.first_ladder = ladder_of(file, file.first, file.sheets.behind_first, a.values.first);
    if (file.second)
      a.second_ladder = ladder_of(file, *file.second, file.sheets.behind_second, a.values.second);
  }
  return a;
}

Figures figures_of(const CoilFile& file, const Answer& a) {
  const LinkValues& v = a.values;
  const double omega = 2 * coil::pi * file.frequency;
  Figures f;
  f.set("first.inductance", v.first, "H");
  f.set("first.resistance", v.first_resistance, "ohm");
  f.set("first.resistance.dc", v.first_resistance_dc, "ohm");
  if (omega > 0) f.set("first.quality", omega * v.first / v.first_resistance, "1");
  if (!file.second) return f;
  f.set("second.inductance", v.second, "H");
  f.set("second.resistance", v.second_resistance, "ohm");
  f.set("second.resistance.dc", v.second_resistance_dc, "ohm");
  if (omega > 0) f.set("second.quality", omega * v.second / v.second_resistance, "1");
  f.set("mutual", v.mutual, "H");
  f.set("coupling", v.coupling, "1");
  if (omega > 0)
    f.set("efficiency.best",
          coil::best_efficiency(v.coupling, f.value("first.quality"), f.value("second.quality")), "1");
  return f;
}

void print_coil(const char* name, double inductance, double resistance, double dc, double quality,
                double frequency) {
  fmt::print("  {:<10}{:>12}{:>14}{:>14}", name, quantity(inductance, "H"), quantity(dc, "ohm"),
             quantity(resistance, "ohm"));
  if (frequency > 0) fmt::print("{:>10.1f}", quality);
  fmt::print("\n");
}

void print_map(const PositionTable& map) {
  const size_t most = 8;
  const auto& shifts = map.shifts();
  const size_t step = (shifts.size() + most - 1) / most;
  fmt::print("\nCoupling factor (down: gap, across: shift, both in mm)\n  {:>8}", "");
  for (size_t i = 0; i < shifts.size(); i += step) fmt::print("{:>9.4g}", shifts[i] * 1e3);
  fmt::print("\n");
  for (const double gap : map.gaps()) {
    fmt::print("  {:>8.4g}", gap * 1e3);
    for (size_t i = 0; i < shifts.size(); i += step)
      fmt::print("{:>9.4f}", map.coupling({gap, shifts[i], map.tilts().front()}));
    fmt::print("\n");
  }
  if (step > 1) fmt::print("  (every {}. shift is shown; --json has all)\n", step);
}

void print_fields(const CoilFile& file, const Answer& a) {
  fmt::print(
      "\nFlux density, largest at each distance from the copper (rms), and share of the ICNIRP 2010 "
      "reference level\n");
  fmt::print("  {:>10}{:>14}{:>10}{:>14}   {}\n", "distance", "flux density", "public", "occupational",
             "where: x, y, z in mm from the first coil's middle");
  for (size_t i = 0; i < a.fields.size(); ++i) {
    const coil::FieldAt& f = a.fields[i];
    fmt::print("  {:>10}{:>14}{:>9.0f}%{:>13.0f}%   {:.0f}, {:.0f}, {:.0f}\n",
               quantity(file.field->distances[i], "m"), quantity(f.flux_density, "T"), 100 * f.public_share,
               100 * f.occupational_share, f.at.x() * 1e3, f.at.y() * 1e3, f.at.z() * 1e3);
  }
  fmt::print("{}\n", wrapped(coil::field_caution(), "  ", "  "));
}

void print_ladder(const char* name, const coil::Ladder& l) {
  fmt::print("\nLadder of the {} coil, {} to {}: in series {} and {}\n", name, quantity(l.low, "Hz"),
             quantity(l.high, "Hz"), quantity(l.resistance, "ohm"), quantity(l.inductance, "H"));
  for (const coil::Branch& b : l.branches)
    fmt::print("  and a branch of {} in parallel with {}\n", quantity(b.resistance, "ohm"),
               quantity(b.inductance, "H"));
  fmt::print("  resistance off by {:.2g} % at most (at {}), inductance by {:.2g} %\n",
             100 * l.resistance_deviation, quantity(l.resistance_deviation_at, "Hz"),
             100 * l.inductance_deviation);
}

void print_summary(const CoilFile& file, const Answer& a, const Figures& figures,
                   std::optional<double> factor) {
  const LinkValues& v = a.values;
  fmt::print("{}\n", file.title.empty() ? file.file : file.title);
  fmt::print("At {}, copper at {:.4g} degC\n\n", file.frequency > 0 ? quantity(file.frequency, "Hz") : "dc",
             file.temperature);
  fmt::print("  {:<10}{:>12}{:>14}{:>14}{}\n", "coil", "inductance", "resistance dc", "resistance",
             file.frequency > 0 ? "   quality" : "");
  print_coil("first", v.first, v.first_resistance, v.first_resistance_dc, figures.value("first.quality"),
             file.frequency);
  if (file.second) {
    print_coil("second", v.second, v.second_resistance, v.second_resistance_dc,
               figures.value("second.quality"), file.frequency);
    fmt::print("\nAt gap {}, shift {}, tilt {:.4g} deg: coupling factor {:.4f}, mutual inductance {}\n",
               quantity(file.place.gap, "m"), quantity(file.place.shift, "m"),
               file.place.tilt * 180 / coil::pi, v.coupling, quantity(v.mutual, "H"));
    if (file.frequency > 0)
      fmt::print("Best efficiency from coil to coil, at the load that suits it: {:.1f} %\n",
                 100 * figures.value("efficiency.best"));
  }
  if (factor) {
    std::string gaps;
    for (const double g : a.gaps) gaps += (gaps.empty() ? "" : " and ") + quantity(g, "m");
    fmt::print("Coupling factor {:.4g}: {}\n", *factor,
               gaps.empty() ? fmt::format("at no gap from {} to {}", quantity(a.map->gaps().front(), "m"),
                                          quantity(a.map->gaps().back(), "m"))
                            : "at a gap of " + gaps);
  }
  if (a.map && !file.gaps.empty()) print_map(*a.map);
  if (file.field) print_fields(file, a);
  if (a.first_ladder) print_ladder("first", *a.first_ladder);
  if (a.second_ladder) print_ladder("second", *a.second_ladder);
  fmt::print("\nWhat the values leave out\n");
  for (const auto& n : v.notes) fmt::print("{}\n", wrapped(n, "  - ", "    "));
}

void add_ladder(Json& json, const char* name, const coil::Ladder& l) {
  json.key(name)
      .open('{')
      .key("resistance")
      .value(l.resistance)
      .key("inductance")
      .value(l.inductance)
      .key("branches")
      .open('[');
  for (const coil::Branch& b : l.branches)
    json.open('{').key("resistance").value(b.resistance).key("inductance").value(b.inductance).close('}');
  json.close(']')
      .key("low")
      .value(l.low)
      .key("high")
      .value(l.high)
      .key("resistance_deviation")
      .value(l.resistance_deviation);
  json.key("inductance_deviation").value(l.inductance_deviation).close('}');
}

std::string details(const CoilFile& file, const Answer& a, std::optional<double> factor) {
  Json json;
  json.key("notes").open('[');
  for (const auto& n : a.values.notes) json.value(n);
  json.close(']');
  if (factor) {
    json.key("gaps_for_factor").open('[');
    for (const double g : a.gaps) json.value(g);
    json.close(']');
  }
  if (a.map) {
    json.key("map").open('[');
    for (const double gap : a.map->gaps())
      for (const double shift : a.map->shifts()) {
        const coil::PairValues v = a.map->at({gap, shift, a.map->tilts().front()});
        json.open('{')
            .key("gap")
            .value(gap)
            .key("shift")
            .value(shift)
            .key("coupling")
            .value(v.coupling())
            .key("mutual")
            .value(v.mutual);
        json.key("first_inductance").value(v.first).key("second_inductance").value(v.second).close('}');
      }
    json.close(']');
  }
  if (file.field) {
    json.key("field").open('[');
    for (size_t i = 0; i < a.fields.size(); ++i) {
      const coil::FieldAt& f = a.fields[i];
      json.open('{')
          .key("distance")
          .value(file.field->distances[i])
          .key("flux_density")
          .value(f.flux_density)
          .key("public_share")
          .value(f.public_share);
      json.key("occupational_share")
          .value(f.occupational_share)
          .key("at")
          .open('[')
          .value(f.at.x())
          .value(f.at.y())
          .value(f.at.z())
          .close(']')
          .close('}');
    }
    json.close(']').key("field_caution").value(coil::field_caution());
  }
  if (a.first_ladder) add_ladder(json, "first_ladder", *a.first_ladder);
  if (a.second_ladder) add_ladder(json, "second_ladder", *a.second_ladder);
  return json.text();
}

void keep_existing(const std::string& path, bool force) {
  if (!force && !path.empty() && path != "-" && std::filesystem::exists(path))
    throw InputError(fmt::format("{}: exists already; give --force to overwrite it", path));
}

std::string plot_of(const CoilFile& file, const PositionTable& map) {
  std::vector<CouplingCurve> curves;
  const size_t step = (map.shifts().size() + 7) / 8;
  // A fine grid of gaps: the curve between the points is what a study would use.
  std::vector<double> gaps;
  for (int i = 0; i <= 120; ++i)
    gaps.push_back(std::min(map.gaps().front() + (map.gaps().back() - map.gaps().front()) * i / 120.0,
                            map.gaps().back()));
  for (size_t i = 0; i < map.shifts().size(); i += step) {
    CouplingCurve& c = curves.emplace_back();
    c.shift = map.shifts()[i];
    for (const double g : gaps) c.couplings.push_back(map.coupling({g, c.shift, map.tilts().front()}));
  }
  return coupling_plot((file.title.empty() ? file.file : file.title) + ": coupling factor", gaps, curves);
}

}  // namespace

int coil_command(const CoilCommand& options) {
  keep_existing(options.json, options.force), keep_existing(options.plot, options.force);
  const CoilFile file = read_coil_file(options.file, options.set);
  std::optional<double> factor;
  if (!options.factor.empty()) {
    const ReadQuantity read = read_quantity(options.factor, "1");
    if (!read.problem.empty()) throw InputError("--factor: " + read.problem);
    if (!file.second)
      throw InputError(fmt::format("{}: --factor needs a second coil; add [second]", file.file));
    factor = read.value;
  }
  if (!options.plot.empty() && file.gaps.size() < 2)
    throw InputError(
        fmt::format("{}: --plot needs [map] with two gaps or more, like gaps = {{ from = \"1 mm\", to = \"20 "
                    "mm\", points = 20 }}",
                    file.file));
  const Answer answer = blame(file, [&] { return work_out(file, factor); });
  const Figures figures = figures_of(file, answer);
  if (!options.quiet && options.json != "-") print_summary(file, answer, figures, factor);
  if (!options.json.empty()) {
    Design named;
    named.title = file.title, named.sha256 = file.sha256;
    write_text(options.json, json_of(named, "coil", status_met, figures, {}, details(file, answer, factor)));
  }
  if (!options.plot.empty()) write_text(options.plot, plot_of(file, *answer.map));
  return status_met;
}

}  // namespace couplet
