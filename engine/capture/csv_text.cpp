// SPDX-License-Identifier: MIT
// Text -> rows of cells: encoding, line ends, separator and decimal mark, where the data begin and end.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <charconv>
#include <cmath>
#include <limits>

#include "engine/capture/csv_stages.h"

namespace couplet::capture {
namespace {

constexpr double no_value = std::numeric_limits<double>::quiet_NaN();
constexpr double infinite = std::numeric_limits<double>::infinity();

struct Line {
  std::size_t number;
  std::string_view text;
};

struct Dialect {
  char separator, decimal;
};

std::vector<Line> lines_of(std::string_view text) {
  std::vector<Line> lines;
  std::size_t number = 0;
  while (!text.empty()) {
    const std::size_t end = text.find_first_of("\r\n");
    std::string_view line = text.substr(0, end);
    ++number;
    if (!trim(line).empty()) lines.push_back({number, line});
    if (end == std::string_view::npos) break;
    const bool pair = text[end] == '\r' && end + 1 < text.size() && text[end + 1] == '\n';
    text.remove_prefix(end + (pair ? 2 : 1));
  }
  return lines;
}

void append_utf8(std::string& out, char32_t code) {
  if (code < 0x80) {
    out += static_cast<char>(code);
  } else if (code < 0x800) {
    out += static_cast<char>(0xC0 | (code >> 6));
    out += static_cast<char>(0x80 | (code & 0x3F));
  } else {
    out += static_cast<char>(0xE0 | (code >> 12));
    out += static_cast<char>(0x80 | ((code >> 6) & 0x3F));
    out += static_cast<char>(0x80 | (code & 0x3F));
  }
}

bool is_utf8(const std::string& text) {
  int following = 0;
  for (const unsigned char c : text) {
    if (following > 0) {
      if ((c & 0xC0) != 0x80) return false;
      --following;
    } else if (c >= 0x80) {
      following = c >= 0xF0 ? 3 : c >= 0xE0 ? 2 : c >= 0xC2 ? 1 : -1;
      if (following < 0) return false;
    }
  }
  return following == 0;
}

/// Marks that instruments write where there is no value. 9.9E37 and 9.91E37 are infinity and not-a-number of
/// the SCPI standard (SCPI-99, volume 1, 7.2.1).
std::optional<double> missing_mark(std::string_view text) {
  const std::string small = lower(text);
  static constexpr std::array<std::string_view, 9> none{"nan", "-nan", "nan(ind)", "-nan(ind)", "#n/a",
                                                        "n/a", "null", "--",       "---"};
  static constexpr std::array<std::string_view, 8> over{"inf",  "+inf", "infinity",  "1.#inf",
                                                        "over", "ovf",  "overrange", "overflow"};
  static constexpr std::array<std::string_view, 3> under{"-inf", "-infinity", "-1.#inf"};
  const auto among = [&](const auto& list) {
    return std::find(list.begin(), list.end(), small) != list.end();
  };
  if (among(none)) return no_value;
  if (among(over)) return infinite;
  if (among(under)) return -infinite;
  return {};
}

std::vector<std::string_view> fields_of(std::string_view line, char separator) {
  std::vector<std::string_view> fields;
  std::size_t begin = 0;
  bool quoted = false;
  for (std::size_t i = 0; i <= line.size(); ++i) {
    if (i < line.size() && line[i] == '"') quoted = !quoted;
    if (i == line.size() || (line[i] == separator && !quoted)) {
      fields.push_back(line.substr(begin, i - begin));
      begin = i + 1;
    }
  }
  return fields;
}

Row row_of(const Line& line, const Dialect& dialect) {
  Row row{line.number, {}};
  for (const std::string_view field : fields_of(line.text, dialect.separator)) {
    row.cells.push_back(read_cell(field, dialect.decimal, line.number));
  }
  while (!row.cells.empty() && row.cells.back().kind == Cell::Kind::empty) row.cells.pop_back();
  return row;
}

/// From `first` on: numbers, marks and units only, beginning with a number (or mark), no text.
bool is_data(const Row& row, std::size_t first = 0) {
  bool number = false;
  for (std::size_t i = first; i < row.cells.size(); ++i) {
    const Cell::Kind kind = row.cells[i].kind;
    if (kind == Cell::Kind::text || (kind == Cell::Kind::unit && !number)) return false;
    number = number || kind == Cell::Kind::number || kind == Cell::Kind::missing;
  }
  return number;
}

Dialect find_dialect(const std::vector<Line>& lines, const std::string& text) {
  std::vector<Dialect> candidates{{'\t', '.'}, {'\t', ','}, {';', '.'}, {';', ','}, {',', '.'}};
  if (text.find('"') != std::string::npos) candidates.push_back({',', ','});
  // Enough lines to tell: the first, where the header is, and some from the middle.
  std::vector<Line> sample(lines.begin(), lines.begin() + std::min<std::ptrdiff_t>(200, std::ssize(lines)));
  for (std::size_t i = std::max<std::size_t>(200, lines.size() / 2); i < lines.size() && sample.size() < 400;
       ++i) {
    sample.push_back(lines[i]);
  }
  Dialect best = candidates.back();
  std::size_t best_score = 0;
  for (const Dialect& dialect : candidates) {
    std::size_t score = 0;
    for (const Line& line : sample) {
      const Row row = row_of(line, dialect);
      const bool parted = row.cells.size() > 1;
      // A line of the header counts little: it tells the separator where the data have only one column.
      score += is_data(row) ? (parted ? 5000 : 500) : (parted ? 1 : 0);
    }
    if (score > best_score) best = dialect, best_score = score;
  }
  if (best_score < 500) {
    throw Refusal(0, "no rows of numbers found; cells may be separated by comma, semicolon or tab");
  }
  return best;
}

/// Column where the data begin: later than 0 where a header stands to the left of them.
std::size_t first_data_column(const std::vector<Row>& rows) {
  const Row& last = rows.back();
  std::size_t first = 0;
  while (first < last.cells.size() && last.cells[first].kind == Cell::Kind::empty) ++first;
  return first;
}

/// "0,05,1,25": comma both as separator and as decimal mark. Nothing tells it from integers but zeros in
/// front and the number of titles.
void refuse_double_comma(const Sheet& sheet) {
  if (sheet.separator != ',' || sheet.decimal != '.') return;
  const std::size_t columns = sheet.data.front().cells.size();
  if (columns < 3) return;
  bool leading_zero = false;
  for (const Row& row : sheet.data) {
    for (const Cell& cell : row.cells) {
      if (cell.kind != Cell::Kind::number) continue;
      if (cell.pointed) return;
      leading_zero = leading_zero || (cell.text.size() > 1 && cell.text.front() == '0' &&
                                      std::isdigit(static_cast<unsigned char>(cell.text[1])));
    }
  }
  const std::size_t titles = sheet.header.empty() ? 0 : sheet.header.back().cells.size();
  if (!leading_zero && titles == columns) return;
  throw Refusal(sheet.data.front().line,
                "commas may be separators or decimal marks here; export again with semicolons or points");
}

/// "1,234;5,678": every comma could part thousands.
void refuse_thousands(const Sheet& sheet) {
  if (sheet.decimal != ',') return;
  bool comma = false;
  for (const Row& row : sheet.data) {
    for (const Cell& cell : row.cells) {
      if (cell.kind != Cell::Kind::number || !cell.pointed) continue;
      comma = true;
      std::string_view text = cell.text;
      if (!text.empty() && (text.front() == '-' || text.front() == '+')) text.remove_prefix(1);
      const std::size_t at = text.find(',');
      const bool three = text.size() == at + 4 && at >= 1 && at <= 3 && text.front() != '0';
      if (!three) return;
    }
  }
  if (comma) {
    throw Refusal(
        sheet.data.front().line,
        "every comma stands before exactly three digits: decimal mark or thousands? export again with "
        "points, or with another number of digits");
  }
}

/// A file that ends inside a row has lost part of its last number, without a trace in that number: "1.2e-0".
void drop_torn_end(Sheet& sheet, bool ends_with_newline) {
  if (ends_with_newline || sheet.data.size() < 2) return;
  const Row& last = sheet.data.back();
  const Row& before = sheet.data[sheet.data.size() - 2];
  const auto length = [](const Row& row) {
    std::string_view digits = row.cells.back().text;
    if (digits.starts_with('-') || digits.starts_with('+')) digits.remove_prefix(1);
    return digits.size();
  };
  const bool fewer = last.cells.size() < before.cells.size();
  if (!fewer && length(last) >= length(before)) return;
  sheet.notes.push_back(fmt::format("line {}: the file ends inside this row, which is left out", last.line));
  sheet.data.pop_back();
}

}  // namespace

std::string_view trim(std::string_view text) {
  static constexpr std::string_view blank = " \t\r\n\"'";
  const std::size_t begin = text.find_first_not_of(blank);
  if (begin == std::string_view::npos) return {};
  return text.substr(begin, text.find_last_not_of(blank) - begin + 1);
}

std::string lower(std::string_view text) {
  std::string small(text);
  for (char& c : small) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  return small;
}

std::string decode(const std::string& text) {
  if (text.starts_with("\xEF\xBB\xBF")) return text.substr(3);
  std::string out;
  if (text.starts_with("\xFF\xFE") || text.starts_with("\xFE\xFF")) {
    const std::size_t high = text[0] == '\xFE' ? 0 : 1;
    for (std::size_t i = 2; i + 1 < text.size(); i += 2) {
      append_utf8(out, (static_cast<unsigned char>(text[i + high]) << 8U) |
                           static_cast<unsigned char>(text[i + 1 - high]));
    }
    return out;
  }
  if (text.find('\0') != std::string::npos)
    throw Refusal(0, "this is no text but a binary file; export as CSV");
  if (is_utf8(text)) return text;
  for (const unsigned char c : text) append_utf8(out, c);  // Latin-1
  return out;
}

Cell read_cell(std::string_view text, char decimal, std::size_t line) {
  Cell cell;
  cell.text = trim(text);
  if (cell.text.empty()) return cell;
  if (const auto mark = missing_mark(cell.text)) {
    cell.kind = Cell::Kind::missing;
    cell.value = *mark;
    return cell;
  }
  std::string number;  // with a point; from_chars knows no plus and no comma
  std::string_view rest = cell.text;
  if (rest.front() == '+') rest.remove_prefix(1);
  if (rest.starts_with("\xE2\x88\x92")) {  // minus sign of typesetters
    number = "-";
    rest.remove_prefix(3);
  }
  const std::size_t end = std::min(rest.find_first_not_of("0123456789.,eE+-"), rest.size());
  number += rest.substr(0, end);
  const bool stranger = number.find(decimal == ',' ? '.' : ',') != std::string::npos;
  std::replace(number.begin(), number.end(), ',', '.');
  double value = 0;
  const auto [stop, error] = std::from_chars(number.data(), number.data() + number.size(), value);
  const auto used = static_cast<std::size_t>(stop - number.data());
  const std::string_view behind = trim(rest.substr(end));
  if (stranger || error != std::errc() || used != number.size()) {
    cell.kind = unit_of(cell.text, line) ? Cell::Kind::unit : Cell::Kind::text;
    if (cell.kind == Cell::Kind::unit) cell.unit = unit_of(cell.text, line);
    return cell;
  }
  if (!behind.empty()) {
    cell.unit = unit_of(behind, line);
    if (!cell.unit) {
      cell.kind = Cell::Kind::text;
      return cell;
    }
  }
  if (std::abs(value) > 9.8e37) {
    cell.kind = Cell::Kind::missing;
    cell.value = std::abs(value) > 9.905e37 ? no_value : std::copysign(infinite, value);
    return cell;
  }
  cell.kind = Cell::Kind::number;
  cell.value = value;
  const std::size_t power = number.find_first_of("eE");
  const std::size_t point = number.find('.');
  const std::size_t mantissa = std::min(power, number.size());
  int exponent = 0;
  if (power != std::string::npos) {
    const char* digits = number.data() + power + (number[power + 1] == '+' ? 2 : 1);
    std::from_chars(digits, number.data() + number.size(), exponent);
  }
  cell.pointed = point != std::string::npos;
  const auto decimals = cell.pointed ? static_cast<int>(mantissa - point - 1) : 0;
  cell.last_digit = std::pow(10.0, exponent - decimals);
  return cell;
}

Sheet split(const std::string& text) {
  const std::vector<Line> lines = lines_of(text);
  if (lines.empty()) throw Refusal(0, "the file is empty");
  const Dialect dialect = find_dialect(lines, text);
  Sheet sheet{dialect.separator, dialect.decimal, {}, {}, {}};
  std::vector<Row> rows;
  rows.reserve(lines.size());
  for (const Line& line : lines) {
    Row row = row_of(line, dialect);
    if (!row.cells.empty()) rows.push_back(std::move(row));
  }
  if (rows.empty()) throw Refusal(0, "the file is empty");

  const std::size_t left = first_data_column(rows);
  std::size_t begin = 0;
  while (begin < rows.size() && !is_data(rows[begin], left)) ++begin;
  std::size_t end = begin;
  while (end < rows.size() && is_data(rows[end], left)) ++end;
  for (std::size_t i = end; i < rows.size(); ++i) {
    if (!is_data(rows[i], left)) continue;
    throw Refusal(
        rows[end].line,
        fmt::format(
            "\"{}\" stands between rows of numbers (a second record, or a torn row?); keep one record "
            "a file",
            std::string(rows[end].cells.front().text).substr(0, 60)));
  }
  if (end < rows.size()) {
    sheet.notes.push_back(
        fmt::format("line {}: {} lines of text behind the data left out", rows[end].line, rows.size() - end));
  }
  // A header to the left of the data keeps its cells; the data lose them.
  for (std::size_t i = 0; i < end; ++i) {
    if (i < begin || left > 0) {
      Row head = rows[i];
      if (left > 0 && i >= begin) head.cells.resize(std::min(left, head.cells.size()));
      sheet.header.push_back(std::move(head));
    }
    if (i < begin) continue;
    rows[i].cells.erase(rows[i].cells.begin(), rows[i].cells.begin() + static_cast<std::ptrdiff_t>(std::min(
                                                                           left, rows[i].cells.size())));
    sheet.data.push_back(std::move(rows[i]));
  }
  drop_torn_end(sheet, text.ends_with('\n') || text.ends_with('\r'));
  if (sheet.data.size() < 2) throw Refusal(0, "fewer than two rows of numbers");
  refuse_double_comma(sheet);
  refuse_thousands(sheet);
  return sheet;
}

}  // namespace couplet::capture
