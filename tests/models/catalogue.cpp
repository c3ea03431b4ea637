// SPDX-License-Identifier: MIT
// The identity suite: every part of the catalogue, without a line for any of them.
#include <fmt/format.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <map>
#include <set>

#include "tests/models/identity.h"

using namespace couplet;
using namespace couplet::test;

namespace {

void none(const std::string& of, const Faults& faults) {
  INFO(of);
  for (const auto& f : faults) FAIL_CHECK(of << ": " << f);
  CHECK(faults.empty());
}

/// Runs `f` for values of the kind that its check lets through.
template <class F>
void where_allowed(const PartKind& kind, const Values& values, F f) {
  if (!kind.check || kind.check(values).empty()) f(values);
}

}  // namespace

TEST_CASE("kinds have names of their own and are found by them") {
  std::set<std::string> names;
  for (const auto& kind : catalogue()) {
    CHECK(names.insert(kind.kind).second);
    CHECK(find_kind(kind.kind) == &kind);
  }
  CHECK(names.size() >= 20);
  CHECK(find_kind("no_such_kind") == nullptr);
}

TEST_CASE("each kind is documented, its defaults lie in range, its example can be read") {
  for (const auto& kind : catalogue()) none(kind.kind, schema_faults(kind));
}

TEST_CASE("each part as its example has it: cells cover, no current steps, nothing gives energy") {
  for (const auto& kind : catalogue()) {
    Faults faults;
    const Values values = example_values(kind, faults);
    none(kind.kind, faults);
    none(kind.kind, part_faults(alone(kind, values), "it", true));
  }
}

TEST_CASE("each part at both ends of each range") {
  int tried = 0;
  for (const auto& kind : catalogue()) {
    Faults faults;
    const Values example = example_values(kind, faults);
    for (const auto& key : kind.keys) {
      if (key.type == Key::Type::word) {
        for (const auto& word : key.words) {
          Values values = example;
          values.words[key.name] = word;
          where_allowed(kind, values, [&](const Values& v) {
            none(fmt::format("{} with {} = {}", kind.kind, key.name, word),
                 part_faults(alone(kind, v), "it", true));
            ++tried;
          });
        }
      }
      if (key.type != Key::Type::quantity && key.type != Key::Type::count) continue;
      if (key.fallback == "-" && !example.has(key.name)) continue;
      for (const double end : {key.low, key.high}) {
        INFO(kind.kind << "." << key.name);
        CHECK(std::isfinite(end));  // a part that takes any number at all has not thought of one
        Values values = example;
        values.numbers[key.name] = end;
        where_allowed(kind, values, [&](const Values& v) {
          none(fmt::format("{} with {} = {}", kind.kind, key.name, end),
               part_faults(alone(kind, v), "it", false));
          ++tried;
        });
      }
    }
  }
  CHECK(tried > 150);
}

TEST_CASE("each part with values drawn around its example") {
  Dice dice(3);
  for (const auto& kind : catalogue()) {
    Faults faults;
    const Values example = example_values(kind, faults);
    for (int draw = 0; draw < 20; ++draw) {
      Values values = example;
      for (const auto& key : kind.keys) {
        const auto found = values.numbers.find(key.name);
        if (found == values.numbers.end()) continue;
        double x = found->second * std::pow(10, 4 * dice.share() - 2);
        if (key.type == Key::Type::count) x = std::round(x);
        found->second = std::clamp(x, key.low, key.high);
      }
      where_allowed(kind, values, [&](const Values& v) {
        none(fmt::format("{}, draw {}", kind.kind, draw), part_faults(alone(kind, v), "it", false));
      });
    }
  }
}

TEST_CASE("each part assembled into a circuit carries the currents its law states") {
  for (const auto& kind : catalogue()) {
    Faults faults;
    const Sheet sheet = tied(alone(kind, example_values(kind, faults)));
    none(kind.kind, stamp_faults(Circuit(sheet), sheet));
  }
}

TEST_CASE("each part is written the same way twice, and beside another of its kind") {
  for (const auto& kind : catalogue()) {
    Faults faults;
    const Values values = example_values(kind, faults);
    const Sheet once = alone(kind, values), again = alone(kind, values);
    CHECK(once.nodes == again.nodes);
    REQUIRE(once.branches.size() == again.branches.size());
    Sheet both = once;
    Nodes nodes;
    for (const auto& t : kind.terminals)
      for (const char* suffix : {"", ".0", ".1"}) nodes[t.name + suffix] = both.node(t.name + suffix);
    kind.write(both, "other", nodes, values);
    INFO(kind.kind);
    CHECK(both.parts.size() == 2 * once.parts.size());
    CHECK(both.branches.size() == 2 * once.branches.size());
    CHECK(both.capacitors.size() == 2 * once.capacitors.size());
    CHECK(
        both.nodes.size() - once.nodes.size() ==
        static_cast<std::size_t>(std::count_if(once.nodes.begin(), once.nodes.end(),
                                               [](const std::string& n) { return n.rfind("it.", 0) == 0; })));
    // Two parts share nothing: the second one's laws refer to its own waveforms, commands, coils and inner
    // nodes.
    std::set<std::string> names;
    for (const auto& p : both.parts) CHECK(names.insert(p.name).second);
    for (std::size_t b = once.branches.size(); b < both.branches.size(); ++b) {
      for (const auto& c : both.branches[b].conditions)
        CHECK((c.command < 0 || c.command >= static_cast<int>(once.commands.size())));
      for (const auto& c : both.branches[b].cells)
        for (const auto& w : c.current.waves) CHECK(w.index >= static_cast<int>(once.waveforms.size()));
    }
  }
}
