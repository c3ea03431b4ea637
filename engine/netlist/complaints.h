// SPDX-License-Identifier: MIT
// Collects what is wrong with a netlist, so that all of it is said at once.
#pragma once

#include <string>
#include <utility>
#include <vector>

#include "engine/netlist/netlist.h"

namespace couplet {

class Complaints {
 public:
  Complaints(std::string file, const std::string& text);
  void add(Place place, const std::string& what);
  bool empty() const { return all_.empty(); }
  /// Throws InputError with all of them, in order of place; does nothing where there are none.
  void raise() const;

 private:
  std::string file_;
  std::vector<std::string> lines_;
  std::vector<std::pair<Place, std::string>> all_;
};

/// "; did you mean X?" for the nearest of `known`, or "; known here: a, b, c" where none is near.
std::string nearest(const std::string& word, const std::vector<std::string>& known);

}  // namespace couplet
