// SPDX-License-Identifier: MIT
// Every checker of the identity suite is shown a part that breaks what it checks, and must say so.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>

#include "tests/models/identity.h"

using namespace couplet;
using namespace couplet::test;

namespace {

bool says(const Faults& faults, const std::string& words) {
  for (const auto& f : faults) UNSCOPED_INFO(f);
  return std::any_of(faults.begin(), faults.end(),
                     [&](const std::string& f) { return f.find(words) != std::string::npos; });
}

struct Honest {
  Sheet sheet;
  Node a = sheet.node("a"), b = sheet.node("b");
  int part = sheet.part("it", "diode", a, b);
  Branch& branch = sheet.branch(part, "it", a, b);
  Honest() {
    Condition conducts;
    conducts.form.volt(a, b).add(-0.4);
    branch.conditions = {conducts};
    branch.cells = {{"blocks", 1, 0, Form().volt(a, b, 1e-6)},
                    {"conducts", 1, 1, Form().volt(a, b, 1e-6 + 20).add(-8)}};
  }
};

PartKind honest_kind() {
  PartKind kind = *find_kind("resistor");
  return kind;
}

}  // namespace

TEST_CASE("an honest part passes") {
  CHECK(part_faults(Honest().sheet, "it", true).empty());
  CHECK(schema_faults(honest_kind()).empty());
}

TEST_CASE("a current that steps at a border is seen") {
  Honest liar;
  liar.branch.cells[1].current.add(1e-9);  // a nanoampere beside amperes
  CHECK(says(law_faults(liar.sheet, false), "steps by"));
}

TEST_CASE("a commanded step is no fault, a step beside it is") {
  Honest honest;
  honest.sheet.command({1e5, 0.5, 0, 0});
  honest.branch.conditions[0].command = 0;
  honest.branch.cells[1].current.constant = 0;
  CHECK(law_faults(honest.sheet, false).empty());
}

TEST_CASE("a part that gives energy is seen") {
  Honest liar;
  liar.branch.cells[0].current = Form().volt(liar.a, liar.b, -1e-9);
  CHECK(says(law_faults(liar.sheet, false), "gives"));
  // A source of role `source` that claims no electromotive force may not hide behind its role.
  Honest source;
  source.sheet.parts[0].role = Role::source;
  source.branch.cells[0].current.add(-1);
  source.branch.cells[1].current.add(-1);
  CHECK(says(law_faults(source.sheet, false), "gives"));
}

TEST_CASE("cells that overlap, leave a gap or ask for too much are seen") {
  Honest overlap;
  overlap.branch.cells[0].mask = 0;
  CHECK(says(cover_faults(overlap.sheet), "has 2 cells for the bits 1"));
  Honest gap;
  gap.branch.cells.pop_back();
  CHECK(says(cover_faults(gap.sheet), "has 0 cells for the bits 1"));
  Honest beyond;
  beyond.branch.cells[0].mask = 3;
  CHECK(says(cover_faults(beyond.sheet), "does not have"));
  Honest value;
  value.branch.cells[0] = {"blocks", 0, 1, Form()};
  CHECK(says(cover_faults(value.sheet), "no bits can fit"));
}

TEST_CASE("a cell that nothing leads to is seen") {
  Honest liar;
  liar.branch.conditions.push_back(liar.branch.conditions[0]);
  liar.branch.conditions[1].form = Form().add(-1);
  liar.branch.cells[1].mask = liar.branch.cells[1].value = 1;
  liar.branch.cells[0] = {"blocks", 3, 0, liar.branch.cells[0].current};
  liar.branch.cells.push_back({"never", 3, 2, liar.branch.cells[0].current});
  CHECK(cover_faults(liar.sheet).empty());
  CHECK(says(law_faults(liar.sheet, true), "no voltages lead it to its cell \"never\""));
}

TEST_CASE("elements that make no sense are seen") {
  Honest infinite;
  infinite.branch.cells[1].current.volt(infinite.a, infinite.b, 1 / std::abs(0.0));
  CHECK(says(element_faults(infinite.sheet, "it"), "not finite"));
  Honest elsewhere;
  elsewhere.branch.cells[1].current.wave(0);
  CHECK(says(element_faults(elsewhere.sheet, "it"), "not on the sheet"));
  Honest empty;
  empty.sheet.capacitor(empty.part, empty.a, empty.b, 0, 0);
  CHECK(says(element_faults(empty.sheet, "it"), "not positive"));
  Honest negative;
  negative.sheet.coil(negative.part, negative.a, negative.b, 1e-6, -1, 0);
  CHECK(says(element_faults(negative.sheet, "it"), "negative resistance"));
  Honest backwards;
  backwards.sheet.waveform({{{1, 0}, {0, 1}}, 0, 0, 0, 0, 0});
  CHECK(says(element_faults(backwards.sheet, "it"), "runs backwards"));
  Honest longer;
  longer.sheet.waveform({{{0, 0}, {1.1, 1}}, 1, 0, 0, 0, 0});
  CHECK(says(element_faults(longer.sheet, "it"), "runs backwards"));
  Honest command;
  command.branch.conditions[0].command = 0;
  CHECK(says(element_faults(command.sheet, "it"), "follows no command"));
  Honest nameless;
  nameless.sheet.branch(nameless.part, "other", nameless.a, nameless.b);
  CHECK(says(element_faults(nameless.sheet, "it"), "does not bear the part's name"));
}

TEST_CASE("a wrong stamp is seen") {
  const Sheet sheet = tied(Honest().sheet);
  const Circuit circuit(sheet);
  CHECK(stamp_faults(circuit, sheet).empty());
  Sheet other = sheet;
  other.branches[0].cells[0].current.volts[0].k *= 1 + 1e-9;
  other.branches[1].cells[0].current.add(1e-9);
  CHECK(says(stamp_faults(circuit, other), "by elements"));
}

TEST_CASE("a kind that is not documented or contradicts itself is seen") {
  const auto with = [](auto change) {
    PartKind kind = honest_kind();
    change(kind);
    return schema_faults(kind);
  };
  CHECK(says(with([](PartKind& k) { k.keys[0].help = ""; }), "resistance is not documented"));
  CHECK(says(with([](PartKind& k) { k.summary = ""; }), "the kind is not documented"));
  CHECK(says(with([](PartKind& k) { k.keys[0].help += "."; }), "full stop"));
  CHECK(says(with([](PartKind& k) { k.keys[0].fallback = "0 ohm"; }), "out of its range"));
  CHECK(says(with([](PartKind& k) { k.keys[0].fallback = "1 kV"; }), "the default of resistance"));
  CHECK(says(with([](PartKind& k) { k.keys[0].unit = "ohmm"; }), "cannot be read"));
  CHECK(says(with([](PartKind& k) { k.keys.push_back(k.keys[0]); }), "name of its own"));
  CHECK(says(with([](PartKind& k) { k.keys[0].high = 0; }), "range of resistance is empty"));
  CHECK(says(with([](PartKind& k) { k.ratings[0].unit = "A"; }), "unit of its figure"));
  CHECK(says(with([](PartKind& k) { k.example += "\nresistanc = \"1 ohm\""; }), "resistanc"));
  CHECK(says(with([](PartKind& k) { k.example = "kind = \"resistor\"\nacross = [\"a\", \"b\"]"; }),
             "resistance"));
  PartKind block = *find_kind("bridge");
  block.summary = "four diodes";
  CHECK(says(schema_faults(block), "does not name the piece upper_a"));
}
