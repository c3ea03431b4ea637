// SPDX-License-Identifier: MIT
// The unit words that oscilloscopes write. They are no proper unit expressions ("Volts", "S" for second,
// "MSa/s"), so a small vocabulary of our own reads them; what it does not know is refused, not guessed.
#include <array>
#include <cctype>
#include <utility>

#include "engine/capture/csv_stages.h"

namespace couplet::capture {
namespace {

using Entry = std::pair<std::string_view, double>;

constexpr std::array<Entry, 8> prefixes{
    {{"f", 1e-15}, {"p", 1e-12}, {"n", 1e-9}, {"u", 1e-6}, {"m", 1e-3}, {"k", 1e3}, {"M", 1e6}, {"G", 1e9}}};

constexpr std::array<Entry, 7> long_prefixes{{{"pico", 1e-12},
                                              {"nano", 1e-9},
                                              {"micro", 1e-6},
                                              {"milli", 1e-3},
                                              {"kilo", 1e3},
                                              {"mega", 1e6},
                                              {"giga", 1e9}}};

// Symbols may carry a one-letter prefix.
constexpr std::array<std::pair<std::string_view, std::string_view>, 11> symbols{{{"s", "s"},
                                                                                 {"V", "V"},
                                                                                 {"A", "A"},
                                                                                 {"W", "W"},
                                                                                 {"Hz", "Hz"},
                                                                                 {"Ohm", "ohm"},
                                                                                 {"ohm", "ohm"},
                                                                                 {"Sa/s", "Hz"},
                                                                                 {"S/s", "Hz"},
                                                                                 {"sec", "s"},
                                                                                 {"Sec", "s"}}};

// Whole words in lower case, with or without a plural s; they may carry a long prefix.
constexpr std::array<std::pair<std::string_view, std::string_view>, 8> words{{{"second", "s"},
                                                                              {"volt", "V"},
                                                                              {"ampere", "A"},
                                                                              {"amp", "A"},
                                                                              {"watt", "W"},
                                                                              {"hertz", "Hz"},
                                                                              {"div", "div"},
                                                                              {"division", "div"}}};

constexpr std::array<std::string_view, 12> raw_words{"adc", "code", "count",   "lsb", "raw", "db",
                                                     "dbv", "dbm",  "percent", "%",   "bit", "level"};

std::string plain(std::string_view word) {
  std::string text(trim(word));
  if (text.size() > 1 && (text.front() == '(' || text.front() == '[') &&
      (text.back() == ')' || text.back() == ']')) {
    text = std::string(trim(std::string_view(text).substr(1, text.size() - 2)));
  }
  // Micro sign, Greek mu and Greek omega in UTF-8.
  for (const auto& [from, to] : std::array<std::pair<std::string, std::string>, 4>{
           {{"\xC2\xB5", "u"}, {"\xCE\xBC", "u"}, {"\xCE\xA9", "Ohm"}, {"\xE2\x84\xA6", "Ohm"}}}) {
    for (std::size_t at = text.find(from); at != std::string::npos; at = text.find(from)) {
      text.replace(at, from.size(), to);
    }
  }
  return text;
}

std::optional<Unit> symbol(std::string_view text) {
  for (const auto& [name, base] : symbols) {
    if (!text.ends_with(name)) continue;
    const std::string_view front = text.substr(0, text.size() - name.size());
    if (front.empty()) return Unit{1, std::string(base)};
    for (const auto& [prefix, factor] : prefixes) {
      if (front == prefix) return Unit{factor, std::string(base)};
    }
  }
  return {};
}

std::optional<Unit> whole_word(std::string_view text) {
  double factor = 1;
  for (const auto& [prefix, value] : long_prefixes) {
    if (text.size() > prefix.size() + 2 && text.starts_with(prefix)) {
      factor = value;
      text.remove_prefix(prefix.size());
      break;
    }
  }
  for (const auto& [word, base] : words) {
    if (text == word || (text.size() == word.size() + 1 && text.starts_with(word) && text.back() == 's')) {
      return Unit{factor, std::string(base)};
    }
  }
  for (const std::string_view word : raw_words) {
    if (text == word || (text.size() == word.size() + 1 && text.starts_with(word) && text.back() == 's')) {
      return Unit{1, "raw"};
    }
  }
  return {};
}

/// Where the unit of a title begins (the mark before it) and its text; npos where there is none.
std::pair<std::size_t, std::string_view> unit_part(std::string_view title) {
  for (const auto& [open, close] : std::array<std::pair<char, char>, 2>{{{'(', ')'}, {'[', ']'}}}) {
    const std::size_t begin = title.rfind(open);
    const std::size_t end = title.rfind(close);
    if (begin != std::string_view::npos && end != std::string_view::npos && begin < end) {
      return {begin, title.substr(begin + 1, end - begin - 1)};
    }
  }
  const std::size_t in = title.rfind(" in ");
  if (in != std::string_view::npos) return {in, title.substr(in + 4)};
  for (const char mark : {'/', '_', ':', ' '}) {
    const std::size_t at = title.rfind(mark);
    if (at == std::string_view::npos || at == 0 || at + 1 >= title.size()) continue;
    // "Channel A" and "probe_A" are names; "Current/A" is a unit.
    if (mark != '/' && title.substr(at + 1) == "A") continue;
    return {at, title.substr(at + 1)};
  }
  return {std::string_view::npos, {}};
}

}  // namespace

std::optional<Unit> unit_of(std::string_view word, std::size_t line) {
  const std::string text = plain(word);
  if (text.empty()) return {};
  if (text == "MV" || text == "MS" || text == "MA" || text == "M") {
    throw Refusal(line, "unit \"" + text + "\" may be milli or mega; write it as mV, ms, mA in the file");
  }
  if (text == "kS" || text == "GS" || text == "kSa" || text == "MSa") return {};  // counts of samples
  if (text.ends_with("S") && text.size() <= 2) return symbol(text.substr(0, text.size() - 1) + "s");
  if (auto unit = symbol(text)) return unit;
  const std::string small = lower(text);
  if (auto unit = whole_word(small)) return unit;
  // Capitals are harmless where no mega can be meant.
  if (small == "v" || small == "a" || small == "us" || small == "ns" || small == "uv" || small == "hz" ||
      small == "khz" || small == "mv" || small == "ma" || small == "ms" || small == "kv") {
    std::string proper = small;
    if (proper.back() == 'v' || proper.back() == 'a') {
      proper.back() = static_cast<char>(std::toupper(static_cast<unsigned char>(proper.back())));
    }
    if (proper.ends_with("hz")) proper[proper.size() - 2] = 'H';
    return symbol(proper);
  }
  return {};
}

std::optional<Unit> unit_in_title(std::string_view title, std::size_t line) {
  if (auto whole = unit_of(title, line)) return whole;
  const auto [at, text] = unit_part(title);
  if (at == std::string_view::npos) return {};
  auto unit = unit_of(text, line);
  const bool bracketed = title[at] == '(' || title[at] == '[';
  if (!unit && bracketed && text.find("div") != std::string_view::npos) return Unit{1, "div"};
  return unit;
}

std::string name_in_title(std::string_view title, std::size_t line) {
  const std::string_view whole = trim(title);
  if (unit_of(whole, line)) return {};
  const auto [at, text] = unit_part(whole);
  const bool bracketed = at != std::string_view::npos && (whole[at] == '(' || whole[at] == '[');
  if (at == std::string_view::npos || (!bracketed && !unit_of(text, line))) return std::string(whole);
  return std::string(trim(whole.substr(0, at)));
}

}  // namespace couplet::capture
