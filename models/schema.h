// SPDX-License-Identifier: MIT
// What a kind of part says of itself. One list of fields, many readers: the netlist reader, `couplet parts`, the
// record's attributes, tolerances and ratings all read this; there is no second list.
#pragma once

#include <limits>
#include <map>
#include <string>
#include <utility>
#include <vector>

#include "models/law.h"

namespace couplet {

/// One key of a part in a netlist.
struct Key {
  enum class Type { quantity, count, word, table, flag };
  std::string name;
  std::string unit;      // SI unit the value is converted to, as UDUNITS-2 reads it; "1" for a plain ratio
  std::string help;      // one line
  std::string fallback;  // the default as a netlist would write it; empty: the key is required; "-": may be left out
  double low = -std::numeric_limits<double>::infinity();  // allowed range in SI, ends included
  double high = std::numeric_limits<double>::infinity();
  bool toleranced = true;           // may carry { value, tolerance }
  Type type = Type::quantity;
  std::vector<std::string> words = {};   // allowed, where type is word
  std::string second_unit = {};      // tables are lists of pairs [first, second]: unit of the second
};

/// A rating that a netlist may state under [parts.NAME.ratings]; `figure` is the figure it bounds from above
/// ("voltage.peak" stands for PART.voltage.peak).
struct Rating {
  std::string name, unit, figure, help;
  std::string of = {};  // blocks: the kind of piece it bounds; empty: every piece
};

struct Terminal {
  std::string name;  // key in the netlist; two-terminal parts have one key "across" with a list of two nodes
  std::string help;
};

/// Values of one part, by key, SI. Keys left out with fallback "-" are absent.
struct Values {
  std::map<std::string, double> numbers;
  std::map<std::string, std::string> words;
  std::map<std::string, std::vector<std::pair<double, double>>> tables;

  bool has(const std::string& key) const { return numbers.count(key) || words.count(key) || tables.count(key); }
  double operator[](const std::string& key) const { return numbers.at(key); }
};

/// Nodes of one part, by terminal; those of "across" (or another list) under "across.0", "across.1".
using Nodes = std::map<std::string, Node>;

struct PartKind {
  std::string kind;
  std::string summary;              // one line
  std::vector<Terminal> terminals;  // in order; one of name "across" stands for a list of two nodes
  std::vector<Key> keys;
  std::vector<Rating> ratings;
  std::string example;  // TOML body of one entry, as a colleague would write it (without the [parts.x] line)
  /// Writes the law of a part called `name` onto the sheet. Values are complete and in range.
  void (*write)(Sheet& sheet, const std::string& name, const Nodes& nodes, const Values& values);
  /// Where values in range can still contradict each other: an empty text, or what is wrong and what to do.
  std::string (*check)(const Values& values) = nullptr;
};

/// The one list of parts, in the order in which `couplet parts` shows them.
const std::vector<PartKind>& catalogue();
/// nullptr where there is no such kind.
const PartKind* find_kind(const std::string& kind);

}  // namespace couplet
