// SPDX-License-Identifier: MIT
#include "engine/netlist/complaints.h"

#include <fmt/format.h>

#include <algorithm>
#include <sstream>

namespace couplet {

Complaints::Complaints(std::string file, const std::string& text) : file_(std::move(file)) {
  std::istringstream in(text);
  for (std::string line; std::getline(in, line);) lines_.push_back(line);
}

void Complaints::add(Place place, const std::string& what) { all_.push_back({place, what}); }

void Complaints::raise() const {
  if (all_.empty()) return;
  auto sorted = all_;
  std::stable_sort(sorted.begin(), sorted.end(), [](const auto& a, const auto& b) {
    return std::pair(a.first.line, a.first.column) < std::pair(b.first.line, b.first.column);
  });
  std::string text;
  for (const auto& [place, what] : sorted) {
    if (!text.empty()) text += '\n';
    if (place.line <= 0) {
      text += fmt::format("{}: {}", file_, what);
      continue;
    }
    text += fmt::format("{}:{}:{}: {}", file_, place.line, place.column, what);
    if (place.line > static_cast<int>(lines_.size())) continue;
    // A long line is shown around the place only.
    std::string line = lines_[place.line - 1];
    int column = place.column;
    constexpr int most = 100;
    if (static_cast<int>(line.size()) > most) {
      const int from = std::max(0, std::min(column - most / 2, static_cast<int>(line.size()) - most));
      line = line.substr(from, most);
      column -= from;
    }
    for (char& c : line) {
      if (static_cast<unsigned char>(c) < 32 || c == 127) c = ' ';
    }
    text += fmt::format("\n    {}\n    {:>{}}", line, "^", std::max(column, 1));
  }
  throw InputError(text);
}

std::string nearest(const std::string& word, const std::vector<std::string>& known) {
  const std::string shown = word.substr(0, 64);
  std::string best;
  std::size_t least = shown.size() / 3 + 2;
  for (const auto& candidate : known) {
    // Edit distance (Levenshtein 1966).
    std::vector<std::size_t> row(candidate.size() + 1);
    for (std::size_t j = 0; j < row.size(); ++j) row[j] = j;
    for (std::size_t i = 1; i <= shown.size(); ++i) {
      std::size_t diagonal = row[0]++;
      for (std::size_t j = 1; j < row.size(); ++j) {
        const std::size_t cost = diagonal + (shown[i - 1] != candidate[j - 1]);
        diagonal = row[j];
        row[j] = std::min({row[j] + 1, row[j - 1] + 1, cost});
      }
    }
    if (row.back() < least) least = row.back(), best = candidate;
  }
  if (!best.empty()) return fmt::format("; did you mean \"{}\"?", best);
  std::string list;
  for (std::size_t i = 0; i < known.size() && i < 24; ++i) list += (i ? ", " : "") + known[i];
  return list.empty() ? "" : "; known here: " + list;
}

}  // namespace couplet
