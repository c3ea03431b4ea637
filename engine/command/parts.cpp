// SPDX-License-Identifier: MIT
#include <fmt/format.h>

#include <cmath>

#include "engine/command/commands.h"
#include "engine/netlist/complaints.h"
#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

std::string range_of(const Key& key) {
  if (key.type == Key::Type::word) {
    std::string words;
    for (const auto& w : key.words) words += (words.empty() ? "" : " | ") + w;
    return words;
  }
  if (key.type == Key::Type::table) return "list of [" + key.unit + ", " + key.second_unit + "]";
  return fmt::format("{} to {}", print_quantity(key.low, key.unit), print_quantity(key.high, key.unit));
}

}  // namespace

int parts_command(const std::string& kind) {
  if (kind.empty()) {
    fmt::print("Kinds of parts (couplet parts KIND shows one):\n\n");
    for (const auto& k : catalogue()) fmt::print("  {:<16}{}\n", k.kind, k.summary);
    return status_met;
  }
  const PartKind* found = find_kind(kind);
  if (!found) {
    std::vector<std::string> kinds;
    for (const auto& k : catalogue()) kinds.push_back(k.kind);
    throw InputError(fmt::format("there is no kind of part \"{}\"{}", kind, nearest(kind, kinds)));
  }
  fmt::print("{}: {}\n\nterminals\n", found->kind, found->summary);
  for (const auto& t : found->terminals) fmt::print("  {:<24}{}\n", t.name, t.help);
  fmt::print("\nkeys\n");
  for (const auto& k : found->keys) {
    const std::string fallback = k.fallback.empty() ? "required" : k.fallback == "-" ? "may be left out" : "default " + k.fallback;
    fmt::print("  {:<24}{}\n  {:<24}{}; {}{}\n", k.name, k.help, "", fallback, range_of(k), k.toleranced && k.type == Key::Type::quantity ? "; may carry a tolerance" : "");
  }
  fmt::print("\nratings (each becomes a limit)\n");
  for (const auto& r : found->ratings) fmt::print("  {:<24}{} [{}]\n", r.name, r.help, r.unit);
  fmt::print("\nexample\n  [parts.NAME]\n");
  std::string line;
  for (const char c : found->example + "\n") {
    if (c != '\n') {
      line += c;
      continue;
    }
    fmt::print("  {}\n", line);
    line.clear();
  }
  return status_met;
}

}  // namespace couplet
