// SPDX-License-Identifier: MIT
#include "tests/models/identity.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <regex>
#include <set>

#include "engine/netlist/checks.h"
#include "engine/quantity/quantity.h"

namespace couplet::test {
namespace {

constexpr double epsilon = std::numeric_limits<double>::epsilon();

bool plain(const std::string& name) {
  return !name.empty() && std::all_of(name.begin(), name.end(), [](unsigned char c) {
    return std::islower(c) || std::isdigit(c) || c == '_';
  });
}

/// Every number and index of a form.
void look(const Sheet& sheet, const Form& form, const std::string& where, Faults& faults) {
  bool finite = std::isfinite(form.constant), there = true;
  const auto within = [&](int i, std::size_t n) { there = there && i >= 0 && i < static_cast<int>(n); };
  for (const auto& v : form.volts) {
    finite = finite && std::isfinite(v.k);
    within(v.plus, sheet.nodes.size()), within(v.minus, sheet.nodes.size());
  }
  for (const auto& c : form.currents)
    finite = finite && std::isfinite(c.k), within(c.index, sheet.coils.size());
  for (const auto& w : form.waves)
    finite = finite && std::isfinite(w.k), within(w.index, sheet.waveforms.size());
  if (!finite) faults.push_back(where + " has a number that is not finite");
  if (!there) faults.push_back(where + " refers to something that is not on the sheet");
}

Point random_point(const Sheet& sheet, Dice& dice) {
  Point p;
  for (std::size_t n = 0; n < sheet.nodes.size(); ++n) p.volts.push_back(n ? dice.any_scale() : 0);
  for (std::size_t c = 0; c < sheet.coils.size(); ++c) p.amperes.push_back(dice.any_scale());
  for (std::size_t w = 0; w < sheet.waveforms.size(); ++w) p.waves.push_back(dice.any_scale());
  return p;
}

Point between(const Point& a, const Point& b, double t) {
  Point p = a;
  const auto mix = [t](std::vector<double>& to, const std::vector<double>& far) {
    for (std::size_t i = 0; i < to.size(); ++i) to[i] = (1 - t) * to[i] + t * far[i];
  };
  mix(p.volts, b.volts), mix(p.amperes, b.amperes), mix(p.waves, b.waves);
  return p;
}

/// A source of current says nothing of its own power: what it absorbs it may as well deliver. (The ledger
/// books it so.)
bool pure_source(const Sheet& sheet, const Branch& b) {
  return sheet.parts[b.part].role == Role::source && !b.has_emf && b.cells.size() == 1 &&
         b.cells[0].current.volts.empty();
}

struct Walk {
  const Sheet& sheet;
  const Branch& branch;
  std::set<int> met;  // cells
  Faults faults;

  bool held(std::size_t c) const {
    return branch.conditions[c].hysteresis || branch.conditions[c].command >= 0;
  }

  int cell(const Point& at, std::uint32_t held_bits) {
    std::uint32_t bits = 0;
    for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
      const bool bit = held(c) ? held_bits >> c & 1U : value(branch.conditions[c].form, at) > 0;
      bits |= static_cast<std::uint32_t>(bit) << c;
    }
    try {
      return Circuit::match_cell(branch, bits);
    } catch (const std::logic_error&) {
      return -1;  // cover_faults tells
    }
  }

  void power(const Point& at, int now) {
    if (pure_source(sheet, branch)) return;
    const Form& current = branch.cells[now].current;
    const double across =
        at.volts[branch.from] - at.volts[branch.to] - (branch.has_emf ? value(branch.emf, at) : 0);
    const double i = value(current, at);
    const double reach = std::abs(at.volts[branch.from]) + std::abs(at.volts[branch.to]) +
                         (branch.has_emf ? size(branch.emf, at) : 0);
    // Both factors carry round-off of their terms.
    const double allowed =
        16 * epsilon *
        (reach * std::abs(i) + std::abs(across) * size(current, at) + reach * epsilon * size(current, at));
    if (across * i < -allowed)
      faults.push_back(
          fmt::format("{} gives {} W in cell \"{}\"", branch.name, -across * i, branch.cells[now].state));
  }

  void along(const Point& a, const Point& b, std::uint32_t held_bits) {
    // Conditions are affine, so each has one place on the line at most; `blur` is how far round-off moves it.
    struct Border {
      double t, blur;
    };
    std::vector<Border> borders;
    for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
      if (held(c)) continue;
      const Form& form = branch.conditions[c].form;
      const double at_a = value(form, a), at_b = value(form, b);
      if ((at_a > 0) == (at_b > 0)) continue;
      const double t = at_a / (at_a - at_b);
      borders.push_back({t, 16 * epsilon * (1 + (size(form, a) + size(form, b)) / std::abs(at_a - at_b))});
    }
    std::sort(borders.begin(), borders.end(), [](const Border& x, const Border& y) { return x.t < y.t; });
    // Borders that round-off does not tell apart are crossed together.
    std::vector<Border> crossings;
    for (const auto& x : borders) {
      if (!crossings.empty() && x.t - x.blur <= crossings.back().t + crossings.back().blur) {
        crossings.back().blur += x.blur + (x.t - crossings.back().t);
      } else {
        crossings.push_back(x);
      }
    }
    double before = 0;
    int cell_before = -1;
    for (std::size_t k = 0; k <= crossings.size(); ++k) {
      const double after = k < crossings.size() ? crossings[k].t : 1;
      const Point middle = between(a, b, 0.5 * (before + after));
      const int now = cell(middle, held_bits);
      if (now < 0) return;
      met.insert(now);
      power(middle, now);
      if (cell_before >= 0 && cell_before != now)
        step(a, b, crossings[k - 1].t, crossings[k - 1].blur, cell_before, now);
      before = after;
      cell_before = now;
    }
  }

  void step(const Point& a, const Point& b, double t, double blur, int left, int right) {
    const Point at = between(a, b, t);
    const Form &l = branch.cells[left].current, &r = branch.cells[right].current;
    Form difference = l;
    difference.plus(r, -1);
    const double jump = std::abs(value(difference, at));
    // Round-off of the terms, and of the place where the border lies times the difference of slopes.
    const double allowed = 16 * epsilon * (size(l, at) + size(r, at)) +
                           2 * blur * std::abs(value(difference, b) - value(difference, a));
    if (!(jump <= allowed)) {
      faults.push_back(fmt::format("{} steps by {} A (round-off: {} A) between \"{}\" and \"{}\"",
                                   branch.name, jump, allowed, branch.cells[left].state,
                                   branch.cells[right].state));
    }
  }
};

void append(Faults& to, const Faults& more) { to.insert(to.end(), more.begin(), more.end()); }

}  // namespace

std::uint64_t
Dice::bits() {  // splitmix64 (G. L. Steele, D. Lea, C. H. Flood, OOPSLA 2014; constants from memory)
  std::uint64_t z = (state_ += 0x9e3779b97f4a7c15U);
  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9U;
  z = (z ^ (z >> 27)) * 0x94d049bb133111ebU;
  return z ^ (z >> 31);
}
double Dice::share() { return static_cast<double>(bits() >> 11) * 0x1p-53; }
double Dice::any_scale() {
  const double sign = bits() & 1U ? 1 : -1;
  return sign * std::pow(10, 6 * share() - 3);
}

double value(const Form& form, const Point& at) {
  double sum = form.constant;
  for (const auto& v : form.volts) sum += v.k * (at.volts[v.plus] - at.volts[v.minus]);
  for (const auto& c : form.currents) sum += c.k * at.amperes[c.index];
  for (const auto& w : form.waves) sum += w.k * at.waves[w.index];
  return sum;
}

double size(const Form& form, const Point& at) {
  double sum = std::abs(form.constant);
  for (const auto& v : form.volts)
    sum += std::abs(v.k) * (std::abs(at.volts[v.plus]) + std::abs(at.volts[v.minus]));
  for (const auto& c : form.currents) sum += std::abs(c.k * at.amperes[c.index]);
  for (const auto& w : form.waves) sum += std::abs(w.k * at.waves[w.index]);
  return sum;
}

Sheet alone(const PartKind& kind, const Values& values) {
  Sheet sheet;
  Nodes nodes;
  for (const auto& terminal : kind.terminals) {
    // A terminal may be one node or a list of two; a law only looks up what it needs.
    for (const char* suffix : {"", ".0", ".1"})
      nodes[terminal.name + suffix] = sheet.node(terminal.name + suffix);
  }
  kind.write(sheet, "it", nodes, values);
  return sheet;
}

Values example_values(const PartKind& kind, Faults& faults) {
  // The example with its nodes tied to gnd by two resistors each, so that no other complaint hides.
  std::set<std::string> nodes{"n"};
  static const std::regex quoted("\"([^\"]*)\""), line("([a-z_]+) = ([^\n]*)");
  for (std::sregex_iterator l(kind.example.begin(), kind.example.end(), line), end; l != end; ++l) {
    const std::string key = (*l)[1], rest = (*l)[2];
    if (std::none_of(kind.terminals.begin(), kind.terminals.end(),
                     [&](const Terminal& t) { return t.name == key; }))
      continue;
    for (std::sregex_iterator q(rest.begin(), rest.end(), quoted); q != end; ++q) nodes.insert((*q)[1]);
  }
  std::string text = "[parts.it]\n" + kind.example +
                     "\n[parts.s]\nkind = \"supply\"\nacross = [\"n\", \"gnd\"]\nvoltage = \"1 V\"\n";
  int count = 0;
  for (const auto& node : nodes) {
    if (node == "gnd") continue;
    for (int twice = 0; twice < 2; ++twice)
      text += fmt::format(
          "[parts.r{}]\nkind = \"resistor\"\nacross = [\"{}\", \"gnd\"]\nresistance = \"1 kohm\"\n", count++,
          node);
  }
  try {
    const Design design = parse_netlist(text, "example of " + kind.kind);
    for (const auto& part : design.parts) {
      if (part.name != "it") continue;
      if (part.kind->kind != kind.kind)
        faults.push_back("the example of " + kind.kind + " is of another kind");
      return values_of(part);
    }
  } catch (const InputError& error) {
    faults.push_back(error.what());
  }
  return {};
}

Faults schema_faults(const PartKind& kind) {
  Faults faults;
  const auto blame = [&](const std::string& what) { faults.push_back(kind.kind + ": " + what); };
  const auto prose = [&](const std::string& text, const std::string& of) {
    if (text.empty()) return blame(of + " is not documented");
    if (text.back() == '.' || std::isspace(static_cast<unsigned char>(text.back())) ||
        text.find('\n') != std::string::npos)
      blame("the help of " + of + " is not one line without a full stop");
  };
  const auto unit = [&](const std::string& u, const std::string& of) {
    if (!read_quantity(u == "1" ? "1" : "1 " + u, u).problem.empty())
      blame("the unit of " + of + " cannot be read");
  };
  if (!plain(kind.kind)) blame("the name is not plain");
  prose(kind.summary, "the kind");
  std::set<std::string> names{"kind", "ratings", "given", "value", "tolerance"};
  for (const auto& t : kind.terminals) {
    if (!plain(t.name) || !names.insert(t.name).second)
      blame("the terminal " + t.name + " needs a name of its own");
    prose(t.help, t.name);
  }
  for (const auto& k : kind.keys) {
    if (!plain(k.name) || !names.insert(k.name).second)
      blame("the key " + k.name + " needs a name of its own");
    prose(k.help, k.name);
    if (!(k.low <= k.high)) blame("the range of " + k.name + " is empty");
    if (k.type == Key::Type::word) {
      if (k.words.size() < 2) blame(k.name + " leaves no choice of words");
      if (!k.fallback.empty() && k.fallback != "-" &&
          std::find(k.words.begin(), k.words.end(), k.fallback) == k.words.end())
        blame("the default of " + k.name + " is none of its words");
      continue;
    }
    unit(k.unit, k.name);
    if (k.type == Key::Type::table) unit(k.second_unit, k.name);
    if (k.fallback.empty() || k.fallback == "-") continue;
    const ReadQuantity read = read_quantity(k.fallback, k.unit);
    if (!read.problem.empty())
      blame("the default of " + k.name + ": " + read.problem);
    else if (!(read.value >= k.low && read.value <= k.high))
      blame("the default of " + k.name + " lies out of its range");
  }
  std::set<std::string> rated;
  for (const auto& r : kind.ratings) {
    if (!plain(r.name) || !rated.insert(r.name).second)
      blame("the rating " + r.name + " needs a name of its own");
    prose(r.help, r.name);
    if (unit_of_figure("it." + r.figure) != r.unit)
      blame("the rating " + r.name + " is not in the unit of its figure");
  }
  const Values values = example_values(kind, faults);
  if (!faults.empty()) return faults;
  if (kind.check && !kind.check(values).empty())
    blame("the example contradicts itself: " + kind.check(values));
  const Sheet sheet = alone(kind, values);
  if (sheet.parts.empty()) blame("it opens no account");
  for (const auto& part : sheet.parts) {
    if (part.name != "it" && kind.summary.find(part.name.substr(3)) == std::string::npos)
      blame("the summary does not name the piece " + part.name.substr(3));
  }
  return faults;
}

Faults element_faults(const Sheet& sheet, const std::string& name) {
  Faults faults;
  const auto owned = [&](const std::string& n) { return n == name || n.rfind(name + ".", 0) == 0; };
  const auto element = [&](int part, const std::string& called, Node from, Node to, double least) {
    if (part < 0 || part >= static_cast<int>(sheet.parts.size()))
      faults.push_back(called + " is on no account");
    for (const Node n : {from, to})
      if (n < 0 || n >= static_cast<int>(sheet.nodes.size())) faults.push_back(called + " ends nowhere");
    if (!owned(called)) faults.push_back(called + " does not bear the part's name");
    if (!(least > 0) || !std::isfinite(least)) faults.push_back(called + " has a size that is not positive");
  };
  std::set<std::string> names;
  for (const auto& p : sheet.parts) {
    if (!owned(p.name) || !names.insert(p.name).second)
      faults.push_back("the account " + p.name + " needs a name of its own");
  }
  std::set<std::string> with_states;
  for (const auto& b : sheet.branches) {
    element(b.part, b.name, b.from, b.to, 1);
    if (b.cells.size() > 1 && !with_states.insert(b.name).second)
      faults.push_back("two branches are called " + b.name);
    for (const auto& c : b.cells) {
      look(sheet, c.current, b.name + "." + c.state, faults);
      if (b.cells.size() > 1 && c.state.empty())
        faults.push_back(b.name + " has a cell without a word for it");
    }
    for (const auto& c : b.conditions) {
      look(sheet, c.form, "a condition of " + b.name, faults);
      look(sheet, c.held, "a condition of " + b.name, faults);
      if (c.command >= static_cast<int>(sheet.commands.size()))
        faults.push_back(b.name + " follows no command");
    }
    look(sheet, b.emf, "the electromotive force of " + b.name, faults);
  }
  for (const auto& c : sheet.capacitors) element(c.part, c.name, c.from, c.to, c.capacitance);
  for (const auto& c : sheet.coils) {
    element(c.part, c.name, c.from, c.to, c.inductance);
    if (!(c.resistance >= 0)) faults.push_back(c.name + " has a negative resistance");
  }
  for (const auto& e : sheet.emfs)
    element(e.part, e.name, e.from, e.to, 1), look(sheet, e.value, e.name, faults);
  for (const auto& t : sheet.transformers)
    element(t.part, t.name, t.a, t.b, t.ratio), element(t.part, t.name, t.c, t.d, 1);
  for (const auto& w : sheet.waveforms) {
    bool good = std::isfinite(w.offset) && std::isfinite(w.amplitude) && std::isfinite(w.frequency) &&
                std::isfinite(w.phase);
    for (std::size_t i = 0; i < w.points.size(); ++i) {
      good = good && std::isfinite(w.points[i].time) && std::isfinite(w.points[i].value);
      good = good && (i == 0 || w.points[i].time >= w.points[i - 1].time);
    }
    // The last point may miss the end of the period by the round-off of the two additions that made it.
    if (w.period > 0 && w.points.back().time - w.points.front().time >
                            w.period * (1 + 4 * epsilon) + 4 * epsilon * std::abs(w.points.back().time))
      good = false;
    if (!good) faults.push_back("a waveform is not finite or runs backwards");
  }
  for (const auto& c : sheet.commands) {
    if (!(c.frequency > 0) || !(c.duty >= 0 && c.duty <= 1) || !(c.dead >= 0))
      faults.push_back("a command makes no sense");
  }
  return faults;
}

Faults cover_faults(const Sheet& sheet) {
  Faults faults;
  Dice dice(7);
  for (const auto& b : sheet.branches) {
    const auto n = static_cast<unsigned>(b.conditions.size());
    const std::uint32_t all = n >= 32 ? ~0U : (1U << n) - 1;
    for (const auto& c : b.cells) {
      if (c.mask & ~all) faults.push_back(b.name + " has a cell that asks for a condition it does not have");
      if (c.value & ~c.mask) faults.push_back(b.name + " has a cell that no bits can fit");
    }
    // All combinations up to twelve conditions, a sample beyond.
    const std::uint32_t count = n <= 12 ? all + 1 : 1U << 14;
    for (std::uint32_t k = 0; k < count; ++k) {
      const std::uint32_t bits = n <= 12 ? k : static_cast<std::uint32_t>(dice.bits()) & all;
      const auto fits = std::count_if(b.cells.begin(), b.cells.end(),
                                      [&](const Cell& c) { return (bits & c.mask) == c.value; });
      if (fits == 1) continue;
      faults.push_back(fmt::format("{} has {} cells for the bits {:b}", b.name, fits, bits));
      break;
    }
  }
  return faults;
}

Faults law_faults(const Sheet& sheet, bool all_cells) {
  Faults faults;
  for (const auto& branch : sheet.branches) {
    Dice dice(11);
    Walk walk{sheet, branch, {}, {}};
    std::vector<std::uint32_t> held_bits{0};
    for (std::size_t c = 0; c < branch.conditions.size(); ++c) {
      if (!walk.held(c)) continue;
      const auto so_far = held_bits;
      for (const auto bits : so_far) held_bits.push_back(bits | 1U << c);
    }
    for (int line = 0; line < 300; ++line) {
      const Point a = random_point(sheet, dice), b = random_point(sheet, dice);
      for (const auto bits : held_bits) walk.along(a, b, bits);
      if (walk.faults.size() > 3) break;
    }
    append(faults, walk.faults);
    if (!all_cells) continue;
    for (std::size_t c = 0; c < branch.cells.size(); ++c) {
      if (!walk.met.count(static_cast<int>(c)))
        faults.push_back(
            fmt::format("no voltages lead {} to its cell \"{}\"", branch.name, branch.cells[c].state));
    }
  }
  return faults;
}

Sheet tied(Sheet sheet) {
  const int part = sheet.part("ties", "resistor", 1, 0);
  for (Node n = 1; n < static_cast<Node>(sheet.nodes.size()); ++n) sheet.resistor(part, n, 0, 1e3);
  return sheet;
}

Faults stamp_faults(const Circuit& circuit, const Sheet& sheet) {
  Faults faults;
  Dice dice(13);
  const int nodes = static_cast<int>(sheet.nodes.size()) - 1, coils = static_cast<int>(sheet.coils.size());
  std::size_t most = 1;
  for (const auto& b : sheet.branches) most = std::max(most, b.cells.size());
  for (std::size_t round = 0; round < most; ++round) {
    std::vector<std::uint8_t> cells;
    for (const auto& b : sheet.branches)
      cells.push_back(static_cast<std::uint8_t>(std::min(round, b.cells.size() - 1)));
    Eigen::MatrixXd G, H;
    circuit.conductance(cells, G, H);
    Eigen::VectorXd z(circuit.unknowns()), rate(circuit.unknowns()),
        u = Eigen::VectorXd::Zero(circuit.inputs());
    for (auto* all : {&z, &rate})
      for (auto& x : *all) x = dice.any_scale();
    u[0] = 1;
    Point at;
    for (int w = 0; w < static_cast<int>(sheet.waveforms.size()); ++w) {
      u[circuit.input_of_waveform(w)] = dice.any_scale();
      at.waves.push_back(sheet.waveforms[w].offset + u[circuit.input_of_waveform(w)]);
    }
    const Eigen::VectorXd w = circuit.outputs_from_unknowns(z), slope = circuit.outputs_from_unknowns(rate);
    at.volts.push_back(0);
    for (Node n = 1; n <= nodes; ++n) at.volts.push_back(w[circuit.row_of_node(n)]);
    for (int c = 0; c < coils; ++c) at.amperes.push_back(w[circuit.row_of_coil(c)]);
    // Current that leaves each node, and the size of its terms.
    Eigen::VectorXd leaves = Eigen::VectorXd::Zero(nodes + 1), terms = leaves;
    const auto flow = [&](Node from, Node to, double i, double reach) {
      leaves[from] += i, leaves[to] -= i;
      terms[from] += reach, terms[to] += reach;
    };
    for (std::size_t b = 0; b < sheet.branches.size(); ++b) {
      const Form& current = sheet.branches[b].cells[cells[b]].current;
      flow(sheet.branches[b].from, sheet.branches[b].to, value(current, at), size(current, at));
    }
    for (const auto& c : sheet.capacitors) {
      const auto rise = [&](Node n) { return n ? slope[circuit.row_of_node(n)] : 0.0; };
      flow(c.from, c.to, c.capacitance * (rise(c.from) - rise(c.to)),
           c.capacitance * (std::abs(rise(c.from)) + std::abs(rise(c.to))));
    }
    for (int c = 0; c < coils; ++c)
      flow(sheet.coils[c].from, sheet.coils[c].to, at.amperes[c], std::abs(at.amperes[c]));
    for (int e = 0; e < static_cast<int>(sheet.emfs.size()); ++e) {
      const double i = w[circuit.row_of_emf(e)];
      flow(sheet.emfs[e].from, sheet.emfs[e].to, i, std::abs(i));
    }
    for (int t = 0; t < static_cast<int>(sheet.transformers.size()); ++t) {
      const auto& s = sheet.transformers[t];
      const double i = w[circuit.row_of_transformer(t)];
      flow(s.a, s.b, i, std::abs(i)), flow(s.d, s.c, s.ratio * i, std::abs(s.ratio * i));
    }
    const Eigen::VectorXd assembled = circuit.mass() * rate + G * z + H * u;
    for (Node n = 1; n <= nodes; ++n) {
      // Both are sums of at most some forty rounded terms.
      if (!(std::abs(assembled[n - 1] - leaves[n]) <= 40 * epsilon * terms[n]))
        faults.push_back(fmt::format("the current out of {} is {} A by elements, {} A as assembled",
                                     sheet.nodes[n], leaves[n], assembled[n - 1]));
    }
    for (int c = 0; c < coils; ++c) {
      const auto& coil = sheet.coils[c];
      double law = coil.inductance * slope[circuit.row_of_coil(c)] + coil.resistance * at.amperes[c],
             reach = std::abs(law);
      for (const auto& m : sheet.couplings) {
        if (m.first == c) law += m.mutual * slope[circuit.row_of_coil(m.second)];
        if (m.second == c) law += m.mutual * slope[circuit.row_of_coil(m.first)];
      }
      reach += std::abs(at.volts[coil.from]) + std::abs(at.volts[coil.to]);
      law -= at.volts[coil.from] - at.volts[coil.to];
      if (!(std::abs(assembled[nodes + c] - law) <= 40 * epsilon * reach))
        faults.push_back(fmt::format("the law of coil {} is off by {} V as assembled", coil.name,
                                     assembled[nodes + c] - law));
    }
  }
  return faults;
}

Faults part_faults(const Sheet& sheet, const std::string& name, bool all_cells) {
  Faults faults = element_faults(sheet, name);
  append(faults, cover_faults(sheet));
  if (faults.empty()) append(faults, law_faults(sheet, all_cells));
  return faults;
}

}  // namespace couplet::test
