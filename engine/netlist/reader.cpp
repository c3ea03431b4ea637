// SPDX-License-Identifier: MIT
// TOML -> Design. The only file that sees toml++.
#include <fmt/format.h>
#include <toml++/toml.h>

#include <algorithm>
#include <fstream>
#include <functional>
#include <sstream>

#include "engine/netlist/checks.h"
#include "engine/netlist/complaints.h"
#include "engine/netlist/sha256.h"
#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

Place place_of(const toml::source_region& region) {
  return {static_cast<int>(region.begin.line), static_cast<int>(region.begin.column)};
}
Place place_of(const toml::node& node) { return place_of(node.source()); }

bool plain_name(const std::string& name) {
  if (name.empty() || name.size() > 64) return false;
  return std::all_of(name.begin(), name.end(), [](unsigned char c) { return std::isalnum(c) || c == '_'; });
}

class Reader {
 public:
  Reader(Design& design, Complaints& complaints) : design_(design), complaints_(complaints) {}

  void read(const toml::table& root) {
    only(root,
         {"title", "rail", "load", "regulator", "supplies", "derating", "assumptions", "not_modelled",
          "given", "parts", "coupling", "schedule", "limits", "run"},
         "the netlist");
    for (const char* role : {"rail", "load", "regulator", "supplies"}) {
      if (const auto* node = root.get(role)) design_.role_places[role] = place_of(*node);
    }
    design_.title = text(root, "title");
    design_.rail = text(root, "rail");
    design_.load = text(root, "load");
    design_.regulator = text(root, "regulator");
    design_.supplies = texts(root, "supplies");
    design_.assumptions = texts(root, "assumptions");
    design_.not_modelled = texts(root, "not_modelled");
    if (const auto* node = root.get("derating")) {
      const Quantity q = quantity(*node, "1", "derating");
      if (q.value <= 0 || q.value > 1)
        complaints_.add(place_of(*node), "derating must lie above 0 and at most 1; write it like \"80 %\"");
      design_.derating = q.value;
    }
    each_table(root, "given",
               [&](const std::string& name, const toml::node& node) { read_given(name, node); });
    each_table(root, "parts",
               [&](const std::string& name, const toml::node& node) { read_part(name, node); });
    each_table(root, "coupling",
               [&](const std::string& name, const toml::node& node) { read_coupling(name, node); });
    each_table(root, "limits",
               [&](const std::string& name, const toml::node& node) { read_limit(name, node); });
    read_schedule(root);
    read_run(root);
    if (design_.parts.empty() && complaints_.empty())
      complaints_.add({}, "there are no parts; add [parts.NAME] tables with a kind each");
  }

 private:
  void only(const toml::table& table, const std::vector<std::string>& allowed, const std::string& where) {
    for (auto&& [key, node] : table) {
      const std::string name(key.str());
      if (std::find(allowed.begin(), allowed.end(), name) == allowed.end()) {
        complaints_.add(place_of(key.source()), fmt::format("unknown key \"{}\" in {}{}", name.substr(0, 64),
                                                            where, nearest(name, allowed)));
      }
    }
  }

  std::string text(const toml::table& table, const std::string& key) {
    const auto* node = table.get(key);
    if (!node) return "";
    if (const auto value = node->value<std::string>(); value && node->is_string()) return *value;
    complaints_.add(place_of(*node), fmt::format("{} must be a text in quotes", key));
    return "";
  }

  std::vector<std::string> texts(const toml::table& table, const std::string& key) {
    std::vector<std::string> list;
    const auto* node = table.get(key);
    if (!node) return list;
    const auto* array = node->as_array();
    if (!array) {
      complaints_.add(place_of(*node), fmt::format("{} must be a list of texts, like [\"a\", \"b\"]", key));
      return list;
    }
    for (const auto& item : *array) {
      if (item.is_string()) {
        list.push_back(*item.value<std::string>());
      } else {
        complaints_.add(place_of(item), fmt::format("{} must hold texts in quotes only", key));
      }
    }
    return list;
  }

  void each_table(const toml::table& root, const std::string& key,
                  const std::function<void(const std::string&, const toml::node&)>& read) {
    const auto* node = root.get(key);
    if (!node) return;
    const auto* table = node->as_table();
    if (!table) {
      complaints_.add(place_of(*node), fmt::format("{} must be a table; write [{}.NAME]", key, key));
      return;
    }
    // toml++ sorts keys; the order of the text is the order that people expect.
    std::vector<std::pair<Place, std::string>> order;
    for (auto&& [name, value] : *table) order.push_back({place_of(name.source()), std::string(name.str())});
    std::sort(order.begin(), order.end(), [](const auto& a, const auto& b) {
      return std::pair(a.first.line, a.first.column) < std::pair(b.first.line, b.first.column);
    });
    for (const auto& [place, name] : order) {
      if (!plain_name(name)) {
        complaints_.add(place, fmt::format("\"{}\" is no name; use letters, digits and _ (at most 64)",
                                           name.substr(0, 64)));
        continue;
      }
      read(name, *table->get(name));
    }
  }

  /// A text with a unit, a number where a plain ratio is wanted, or a table { value, tolerance, origin } or {
  /// given }.
  Quantity quantity(const toml::node& node, const std::string& unit, const std::string& what) {
    Quantity q;
    q.unit = unit;
    q.place = place_of(node);
    if (const auto* table = node.as_table()) {
      only(*table, {"value", "tolerance", "origin", "given"}, what);
      q.origin = text(*table, "origin");
      if (const auto* tolerance = table->get("tolerance")) {
        const Quantity t = quantity(*tolerance, "1", "tolerance");
        if (t.value < 0 || t.value >= 1)
          complaints_.add(place_of(*tolerance), "a tolerance must lie between 0 and 100 %");
        q.tolerance = t.value;
      }
      const auto* value = table->get("value");
      const auto* given = table->get("given");
      if ((value != nullptr) == (given != nullptr)) {
        complaints_.add(q.place, fmt::format("{} must hold either value or given", what));
        q.value = std::numeric_limits<double>::quiet_NaN();
      } else if (value) {
        const Quantity inner = quantity(*value, unit, what);
        q.value = inner.value;
      } else {
        q.given = text(*table, "given");
        q.place = place_of(*given);
        const auto found = std::find_if(design_.given.begin(), design_.given.end(),
                                        [&](const Given& g) { return g.name == q.given; });
        if (found == design_.given.end()) {
          std::vector<std::string> names;
          for (const auto& g : design_.given) names.push_back(g.name);
          complaints_.add(q.place, fmt::format("there is no given value \"{}\"{}", q.given.substr(0, 64),
                                               nearest(q.given, names)));
          q.value = std::numeric_limits<double>::quiet_NaN();
        } else {
          q.value = given_value(*found, unit, q.place);
          if (!q.tolerance) q.tolerance = found->quantity.tolerance;
        }
      }
      return q;
    }
    if (node.is_string()) {
      const ReadQuantity read = read_quantity(*node.value<std::string>(), unit);
      if (!read.problem.empty()) {
        complaints_.add(q.place, fmt::format("{}: {}", what, read.problem));
        q.value = std::numeric_limits<double>::quiet_NaN();
      } else {
        q.value = read.value;
      }
      return q;
    }
    if (node.is_number()) {
      q.value = *node.value<double>();
      if (unit != "1") {
        complaints_.add(q.place,
                        fmt::format("{}: a bare number has no unit; write it in quotes, like \"{} {}\"", what,
                                    q.value, unit));
        q.value = std::numeric_limits<double>::quiet_NaN();
      }
      return q;
    }
    complaints_.add(q.place, fmt::format("{} must be a text with a unit, like \"10 {}\"", what,
                                         unit == "1" ? "%" : unit));
    q.value = std::numeric_limits<double>::quiet_NaN();
    return q;
  }

  /// A given is read without knowing its dimension; its first user settles it.
  double given_value(const Given& given, const std::string& unit, Place place) {
    Given& mutable_given = const_cast<Given&>(given);
    const auto& texts = given_texts_[given.name];
    if (!mutable_given.quantity.unit.empty() && mutable_given.quantity.unit != unit) {
      complaints_.add(place,
                      fmt::format("{} is used in {} here and in {} elsewhere; make two given values of it",
                                  given.name, unit, mutable_given.quantity.unit));
    }
    const bool first = mutable_given.quantity.unit.empty();
    mutable_given.quantity.unit = unit;
    const auto convert = [&](const std::pair<std::string, Place>& text, const char* what) {
      const ReadQuantity read = read_quantity(text.first, unit);
      if (!read.problem.empty() && first)
        complaints_.add(text.second, fmt::format("{} of {}: {}", what, given.name, read.problem));
      return read.problem.empty() ? read.value : std::numeric_limits<double>::quiet_NaN();
    };
    mutable_given.quantity.value = convert(texts.at("value"), "value");
    if (texts.count("low")) mutable_given.low = convert(texts.at("low"), "low");
    if (texts.count("high")) mutable_given.high = convert(texts.at("high"), "high");
    if (first && mutable_given.low && mutable_given.high && *mutable_given.low > *mutable_given.high) {
      complaints_.add(texts.at("low").second,
                      fmt::format("low of {} lies above its high; swap them", given.name));
    }
    return mutable_given.quantity.value;
  }

  void read_given(const std::string& name, const toml::node& node) {
    Given g;
    g.name = name;
    g.quantity.place = place_of(node);
    auto& texts = given_texts_[name];
    const auto as_text = [&](const toml::node& n, const std::string& what) {
      if (n.is_string()) {
        texts[what] = {*n.value<std::string>(), place_of(n)};
      } else if (n.is_number()) {
        texts[what] = {fmt::format("{}", *n.value<double>()), place_of(n)};
      } else {
        complaints_.add(place_of(n), fmt::format("{} of {} must be a text with a unit", what, name));
        texts[what] = {"0", place_of(n)};
      }
    };
    if (const auto* table = node.as_table()) {
      only(*table, {"value", "low", "high", "tolerance", "origin"}, "[given]");
      for (const char* key : {"value", "low", "high"}) {
        if (const auto* n = table->get(key)) as_text(*n, key);
      }
      g.quantity.origin = text(*table, "origin");
      if (const auto* tolerance = table->get("tolerance"))
        g.quantity.tolerance = quantity(*tolerance, "1", "tolerance").value;
      if (!texts.count("value")) {
        complaints_.add(g.quantity.place,
                        fmt::format("given value {} has no value; add value = \"...\"", name));
        texts["value"] = {"0", g.quantity.place};
      }
    } else {
      as_text(node, "value");
    }
    design_.given.push_back(g);
  }

  void read_part(const std::string& name, const toml::node& node) {
    const auto* table = node.as_table();
    if (!table) {
      complaints_.add(place_of(node), fmt::format("parts.{} must be a table; write [parts.{}]", name, name));
      return;
    }
    PartEntry part;
    part.name = name;
    part.place = place_of(node);
    const auto* kind_node = table->get("kind");
    if (!kind_node) {
      complaints_.add(
          part.place,
          fmt::format("part {} has no kind; add kind = \"...\" (couplet parts lists them)", name));
      return;
    }
    const std::string kind = text(*table, "kind");
    part.kind = find_kind(kind);
    if (!part.kind) {
      std::vector<std::string> kinds;
      for (const auto& k : catalogue()) kinds.push_back(k.kind);
      if (kind_node->is_string())
        complaints_.add(place_of(*kind_node), fmt::format("there is no kind of part \"{}\"{}",
                                                          kind.substr(0, 64), nearest(kind, kinds)));
      return;
    }
    std::vector<std::string> allowed = {"kind", "ratings"};
    for (const auto& t : part.kind->terminals) allowed.push_back(t.name);
    for (const auto& k : part.kind->keys) allowed.push_back(k.name);
    only(*table, allowed, fmt::format("part {} ({})", name, kind));
    read_terminals(*table, part);
    for (const auto& key : part.kind->keys) read_key(*table, key, part);
    read_ratings(*table, part);
    design_.parts.push_back(std::move(part));
  }

  void read_terminals(const toml::table& table, PartEntry& part) {
    for (const auto& terminal : part.kind->terminals) {
      const auto* node = table.get(terminal.name);
      const bool pair = terminal.name == "across" || terminal.name == "first" || terminal.name == "second";
      if (!node) {
        complaints_.add(part.place, fmt::format("part {} has no {} ({}); add {} = {}", part.name,
                                                terminal.name, terminal.help, terminal.name,
                                                pair ? "[\"node\", \"node\"]" : "\"node\""));
        continue;
      }
      if (!pair) {
        const std::string n = text(table, terminal.name);
        if (node->is_string()) node_name(n, place_of(*node));
        part.nodes[terminal.name] = n;
        continue;
      }
      const auto names = texts(table, terminal.name);
      if (node->is_array() && names.size() != 2) {
        complaints_.add(place_of(*node), fmt::format("{} of {} must name two nodes, like [\"a\", \"gnd\"]",
                                                     terminal.name, part.name));
        continue;
      }
      for (std::size_t i = 0; i < names.size(); ++i) {
        node_name(names[i], place_of(*node));
        part.nodes[terminal.name + "." + std::to_string(i)] = names[i];
      }
    }
  }

  void node_name(const std::string& name, Place place) {
    if (!plain_name(name))
      complaints_.add(
          place, fmt::format("\"{}\" is no name for a node; use letters, digits and _", name.substr(0, 64)));
  }

  void read_key(const toml::table& table, const Key& key, PartEntry& part) {
    const auto* node = table.get(key.name);
    const std::string what = fmt::format("{} of {}", key.name, part.name);
    if (!node) {
      if (key.fallback == "-") return;
      if (key.fallback.empty()) {
        complaints_.add(part.place,
                        fmt::format("part {} has no {} ({}); add {} = \"... {}\"", part.name, key.name,
                                    key.help, key.name, key.unit == "1" ? "" : key.unit));
        return;
      }
      if (key.type == Key::Type::word) {
        part.words[key.name] = key.fallback;
      } else {
        Quantity q;
        q.unit = key.unit;
        q.value = read_quantity(key.fallback, key.unit).value;
        q.origin = "default";
        part.values[key.name] = q;
      }
      return;
    }
    if (key.type == Key::Type::word) {
      const std::string word = text(table, key.name);
      if (node->is_string() && std::find(key.words.begin(), key.words.end(), word) == key.words.end()) {
        complaints_.add(place_of(*node), fmt::format("{} cannot be \"{}\"{}", what, word.substr(0, 64),
                                                     nearest(word, key.words)));
      }
      part.words[key.name] = word;
      return;
    }
    if (key.type == Key::Type::table) {
      read_points(*node, key, part, what);
      return;
    }
    Quantity q = quantity(*node, key.unit, what);
    if (q.tolerance && !key.toleranced)
      complaints_.add(q.place, fmt::format("{} carries no tolerance", what));
    if (key.type == Key::Type::count && q.value != std::floor(q.value))
      complaints_.add(q.place, fmt::format("{} must be a whole number", what));
    if (q.given.empty() && (q.value < key.low || q.value > key.high)) {
      complaints_.add(
          q.place,
          fmt::format("{} is {}; it must lie between {} and {}", what, print_quantity(q.value, key.unit),
                      print_quantity(key.low, key.unit), print_quantity(key.high, key.unit)));
    }
    part.values[key.name] = q;
  }

  void read_points(const toml::node& node, const Key& key, PartEntry& part, const std::string& what) {
    const auto* array = node.as_array();
    if (!array) {
      complaints_.add(
          place_of(node),
          fmt::format("{} must be a list of pairs, like [[\"0 s\", \"0 V\"], [\"1 ms\", \"12 V\"]]", what));
      return;
    }
    auto& points = part.tables[key.name];
    for (const auto& item : *array) {
      const auto* pair = item.as_array();
      if (!pair || pair->size() != 2) {
        complaints_.add(place_of(item), fmt::format("each entry of {} must be a pair [time, value]", what));
        continue;
      }
      points.push_back({quantity(*pair->get(0), key.unit, what).value,
                        quantity(*pair->get(1), key.second_unit, what).value});
    }
  }

  void read_ratings(const toml::table& table, PartEntry& part) {
    const auto* node = table.get("ratings");
    if (!node) return;
    const auto* ratings = node->as_table();
    if (!ratings) {
      complaints_.add(place_of(*node), fmt::format("ratings of {} must be a table", part.name));
      return;
    }
    std::vector<std::string> allowed;
    for (const auto& r : part.kind->ratings) allowed.push_back(r.name);
    only(*ratings, allowed, fmt::format("the ratings of {}", part.name));
    for (const auto& r : part.kind->ratings) {
      const auto* value = ratings->get(r.name);
      if (!value) continue;
      const Quantity q = quantity(*value, r.unit, fmt::format("rating {} of {}", r.name, part.name));
      if (q.value <= 0)
        complaints_.add(q.place, fmt::format("rating {} of {} must be positive", r.name, part.name));
      part.ratings[r.name] = q;
    }
  }

  void read_coupling(const std::string& name, const toml::node& node) {
    const auto* table = node.as_table();
    if (!table) {
      complaints_.add(place_of(node), fmt::format("coupling.{} must be a table", name));
      return;
    }
    only(*table, {"coils", "factor", "mutual"}, fmt::format("coupling {}", name));
    CouplingEntry c;
    c.name = name;
    c.place = place_of(node);
    c.coils = texts(*table, "coils");
    if (c.coils.size() < 2)
      complaints_.add(
          c.place,
          fmt::format("coupling {} must name at least two coils, like coils = [\"dock_coil\", \"lid_coil\"]",
                      name));
    const auto* factor = table->get("factor");
    const auto* mutual = table->get("mutual");
    if ((factor != nullptr) == (mutual != nullptr)) {
      complaints_.add(c.place, fmt::format("coupling {} must hold either factor or mutual", name));
      return;
    }
    c.by_factor = factor != nullptr;
    c.amount = quantity(factor ? *factor : *mutual, factor ? "1" : "H", factor ? "factor" : "mutual");
    if (factor && !(std::abs(c.amount.value) < 1))
      complaints_.add(c.amount.place,
                      fmt::format("the coupling factor of {} must lie between -1 and 1", name));
    design_.couplings.push_back(c);
  }

  void read_limit(const std::string& name, const toml::node& node) {
    const auto* table = node.as_table();
    if (!table) {
      complaints_.add(place_of(node), fmt::format("limits.{} must be a table", name));
      return;
    }
    only(*table, {"figure", "at_least", "at_most", "within", "why", "source"}, fmt::format("limit {}", name));
    Limit limit;
    limit.name = name;
    limit.place = place_of(node);
    limit.figure = text(*table, "figure");
    limit.why = text(*table, "why");
    limit.source = text(*table, "source");
    if (limit.figure.empty())
      complaints_.add(limit.place, fmt::format("limit {} names no figure; add figure = \"rail.max\"", name));
    const std::string unit = unit_of_figure(limit.figure);
    const auto* least = table->get("at_least");
    const auto* most = table->get("at_most");
    if (least) limit.at_least = quantity(*least, unit, "at_least");
    if (most) limit.at_most = quantity(*most, unit, "at_most");
    if (const auto* within = table->get("within")) {
      const auto* pair = within->as_array();
      if (!pair || pair->size() != 2) {
        complaints_.add(place_of(*within), "within must be a pair, like [\"100 kHz\", \"148.5 kHz\"]");
      } else {
        limit.at_least = quantity(*pair->get(0), unit, "within");
        limit.at_most = quantity(*pair->get(1), unit, "within");
      }
    } else if (!least && !most) {
      complaints_.add(limit.place,
                      fmt::format("limit {} has no bound; add at_least, at_most or within", name));
    }
    if (limit.at_least && limit.at_most && limit.at_least->value > limit.at_most->value) {
      complaints_.add(
          limit.place,
          fmt::format("limit {} can never be met: its lower bound lies above the upper one", name));
    }
    design_.limits.push_back(limit);
  }

  void read_schedule(const toml::table& root) {
    const auto* node = root.get("schedule");
    if (!node) return;
    const auto* array = node->as_array();
    if (!array) {
      complaints_.add(place_of(*node), "schedule must be a list; write [[schedule]]");
      return;
    }
    double before = 0;
    for (const auto& item : *array) {
      const auto* table = item.as_table();
      if (!table) {
        complaints_.add(place_of(item), "each schedule entry must be a table with at and set");
        continue;
      }
      only(*table, {"at", "set"}, "schedule");
      ScheduleEntry entry;
      entry.place = place_of(item);
      const auto* at = table->get("at");
      const auto* set = table->get("set");
      if (!at || !set || !set->as_table()) {
        complaints_.add(entry.place, "a schedule entry needs at = \"5 ms\" and set = { load = \"1 Mohm\" }");
        continue;
      }
      entry.time = quantity(*at, "s", "at");
      if (entry.time.value <= before)
        complaints_.add(entry.time.place, "schedule times must be positive and rise from entry to entry");
      before = entry.time.value;
      for (auto&& [key, value] : *set->as_table()) {
        const std::string name(key.str());
        const auto found = std::find_if(design_.given.begin(), design_.given.end(),
                                        [&](const Given& g) { return g.name == name; });
        if (found == design_.given.end()) {
          std::vector<std::string> names;
          for (const auto& g : design_.given) names.push_back(g.name);
          complaints_.add(place_of(key.source()),
                          fmt::format("the schedule sets \"{}\", which is no given value{}",
                                      name.substr(0, 64), nearest(name, names)));
          continue;
        }
        if (found->quantity.unit.empty()) {
          complaints_.add(
              place_of(key.source()),
              fmt::format("the schedule sets {}, which no part uses; let a part have {{ given = \"{}\" }}",
                          name, name));
          continue;
        }
        entry.changes[name] = quantity(value, found->quantity.unit, name);
      }
      design_.schedule.push_back(entry);
    }
  }

  void read_run(const toml::table& root) {
    const auto* node = root.get("run");
    if (!node) return;
    const auto* table = node->as_table();
    if (!table) {
      complaints_.add(place_of(*node), "run must be a table; write [run]");
      return;
    }
    only(*table, {"duration", "step_ceiling", "record", "points_per_period", "section", "window_periods"},
         "[run]");
    const auto positive = [&](const char* key, const char* unit) -> std::optional<double> {
      const auto* n = table->get(key);
      if (!n) return {};
      const Quantity q = quantity(*n, unit, key);
      if (q.value <= 0) complaints_.add(q.place, fmt::format("{} must be positive", key));
      return q.value;
    };
    design_.run.duration = positive("duration", "s");
    design_.run.step_ceiling = positive("step_ceiling", "s");
    if (const auto n = positive("points_per_period", "1"))
      design_.run.points_per_period = static_cast<int>(*n);
    if (const auto n = positive("window_periods", "1")) design_.run.window_periods = static_cast<int>(*n);
    design_.run.record = texts(*table, "record");
    design_.run.section = text(*table, "section");
  }

  Design& design_;
  Complaints& complaints_;
  std::map<std::string, std::map<std::string, std::pair<std::string, Place>>> given_texts_;
};

bool is_utf8(const std::string& text, int& line) {
  line = 1;
  for (std::size_t i = 0; i < text.size();) {
    const unsigned char c = text[i];
    if (c == '\n') ++line;
    if (c == 0) return false;
    const int more = c < 0x80                ? 0
                     : c >= 0xC2 && c < 0xE0 ? 1
                     : c >= 0xE0 && c < 0xF0 ? 2
                     : c >= 0xF0 && c < 0xF5 ? 3
                                             : -1;
    if (more < 0 || i + more >= text.size() + (more == 0 ? 1 : 0)) return false;
    for (int k = 1; k <= more; ++k) {
      if ((static_cast<unsigned char>(text[i + k]) & 0xC0) != 0x80) return false;
    }
    i += more + 1;
  }
  return true;
}

}  // namespace

Design parse_netlist(const std::string& text, const std::string& file,
                     const std::vector<std::string>& overrides) {
  Complaints complaints(file, text);
  constexpr std::size_t largest = 16 << 20;
  if (text.size() > largest)
    throw InputError(file + ": the file is larger than 16 MB; a netlist is a page of text");
  int line = 0;
  if (!is_utf8(text, line)) {
    complaints.add({line, 1}, "this is not UTF-8 text; save the netlist as UTF-8");
    complaints.raise();
  }
  Design design;
  design.file = file;
  design.text = text;
  design.sha256 = sha256(text);
  try {
    const toml::table root = toml::parse(text, file);
    Reader(design, complaints).read(root);
  } catch (const toml::parse_error& error) {
    complaints.add(place_of(error.source()),
                   fmt::format("{}; see the TOML rules for texts, tables and lists", error.description()));
    complaints.raise();
  }
  check_design(design, complaints);
  complaints.raise();
  for (const auto& text_of_override : overrides) {
    const auto equals = text_of_override.find('=');
    if (equals == std::string::npos)
      throw InputError(
          fmt::format("--set {}: write it as NAME=VALUE, like --set load=\"20 ohm\"", text_of_override));
    design.set(text_of_override.substr(0, equals), text_of_override.substr(equals + 1));
  }
  if (!overrides.empty()) {
    check_values(design, complaints);
    complaints.raise();
  }
  return design;
}

Design read_netlist(const std::string& file, const std::vector<std::string>& overrides) {
  std::ifstream in(file, std::ios::binary);
  if (!in) throw InputError(fmt::format("{}: the file cannot be read; check the path", file));
  std::ostringstream text;
  text << in.rdbuf();
  if (!in && text.str().empty())
    throw InputError(fmt::format("{}: the file cannot be read or is empty", file));
  return parse_netlist(text.str(), file, overrides);
}

}  // namespace couplet
