// SPDX-License-Identifier: MIT
#include "engine/command/output.h"

#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <chrono>
#include <cmath>
#include <cstdlib>
#include <fstream>

#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

double now() { return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count(); }

std::string escaped(const std::string& text) {
  std::string out = "\"";
  for (const char c : text) {
    switch (c) {
      case '"': out += "\\\""; break;
      case '\\': out += "\\\\"; break;
      case '\n': out += "\\n"; break;
      case '\t': out += "\\t"; break;
      case '\r': out += "\\r"; break;
      default:
        if (static_cast<unsigned char>(c) < 0x20) {
          out += fmt::format("\\u{:04x}", static_cast<unsigned char>(c));
        } else {
          out += c;
        }
    }
  }
  return out + "\"";
}

bool of_a_part(const std::string& name) {
  for (const char* tail : {".loss", ".voltage.peak", ".current.peak", ".current.rms", ".current.mean", ".voltage.highest", ".current.highest", ".edge.voltage", ".edge.energy"}) {
    const std::string t = tail;
    if (name.size() > t.size() && name.compare(name.size() - t.size(), t.size(), t) == 0) return true;
  }
  return false;
}

std::string print(double value, const std::string& unit) { return print_quantity(value, unit, 6); }

}  // namespace

void Json::separate() {
  if (after_key_) {
    after_key_ = false;
    return;
  }
  if (!fresh_) text_ += ", ";
  fresh_ = false;
}
Json& Json::key(const std::string& name) {
  separate();
  text_ += escaped(name) + ": ";
  after_key_ = true;
  return *this;
}
Json& Json::value(const std::string& text) { return separate(), text_ += escaped(text), fresh_ = false, *this; }
Json& Json::value(double number) { return separate(), text_ += std::isfinite(number) ? fmt::format("{}", number) : "null", fresh_ = false, *this; }
Json& Json::value(long number) { return separate(), text_ += fmt::format("{}", number), fresh_ = false, *this; }
Json& Json::value(bool truth) { return separate(), text_ += truth ? "true" : "false", fresh_ = false, *this; }

std::string json_of(const Design& design, const std::string& command, int status, const Figures& figures, const std::vector<Verdict>& verdicts, const std::string& more) {
  Json json;
  json.open('{').key("design").value(design.title).key("command").value(command).key("version").value(COUPLET_VERSION);
  json.key("netlist_sha256").value(design.sha256).key("status").value(static_cast<long>(status));
  json.key("figures").open('{');
  for (const auto& f : figures.all()) {
    json.key(f.name).open('{').key("value").value(f.value).key("unit").value(f.unit);
    if (f.when) json.key("when").value(*f.when);
    json.close('}');
  }
  json.close('}').key("verdicts").open('[');
  for (const auto& v : verdicts) {
    json.open('{').key("name").value(v.name).key("figure").value(v.figure).key("status").value(status_word(v.status));
    json.key("value").value(v.value).key("unit").value(v.unit);
    if (v.at_least) json.key("at_least").value(*v.at_least);
    if (v.at_most) json.key("at_most").value(*v.at_most);
    json.key("margin").value(v.margin).key("margin_percent").value(v.margin_percent);
    if (v.when) json.key("when").value(*v.when);
    json.key("why").value(v.why).key("source").value(v.source).close('}');
  }
  json.close(']');
  return json.text() + (more.empty() ? "" : ", " + more) + "}\n";
}

void write_text(const std::string& path, const std::string& text) {
  if (path == "-") {
    std::fwrite(text.data(), 1, text.size(), stdout);
    return;
  }
  const std::string temporary = path + ".part";
  {
    std::ofstream out(temporary, std::ios::binary);
    out << text;
    if (!out.flush()) throw InputError(fmt::format("{}: cannot be written; check the folder and the space left", path));
  }
  if (std::rename(temporary.c_str(), path.c_str()) != 0) throw InputError(fmt::format("{}: cannot be written; check the folder", path));
}

std::string figure_table(const Figures& figures, bool parts) {
  std::string text;
  for (const auto& f : figures.all()) {
    if (of_a_part(f.name) != parts) continue;
    const std::string value = f.unit == "1" ? fmt::format("{:.6g}", f.value) : print(f.value, f.unit);
    text += fmt::format("  {:<32}{:>16}{}\n", f.name, value, f.when ? "   at " + print(*f.when, "s") : "");
  }
  return text;
}

std::string verdict_table(const std::vector<Verdict>& verdicts, bool verbose) {
  std::string text;
  long silent = 0;
  for (const auto& v : verdicts) {
    if (v.status == Verdict::Status::not_judged && v.at_most == std::nullopt && v.at_least == std::nullopt && !verbose) {
      ++silent;
      continue;
    }
    std::string bound;
    if (v.at_least) bound += "at least " + print_quantity(*v.at_least, v.unit);
    if (v.at_most) bound += (bound.empty() ? "at most " : ", at most ") + print_quantity(*v.at_most, v.unit);
    if (v.status == Verdict::Status::not_judged) {
      text += fmt::format("  {:<11}{:<34}{}\n", status_word(v.status), v.name, v.why);
      continue;
    }
    text += fmt::format("  {:<11}{:<34}{:>12}  {:<34}margin {:>10} ({:.0f} %)\n", status_word(v.status), v.name, print_quantity(v.value, v.unit), bound,
                        print_quantity(v.margin, v.unit), v.margin_percent);
  }
  if (silent > 0) text += fmt::format("  not judged: {} ratings that the netlist does not give (--verbose lists them)\n", silent);
  return text;
}

std::string loss_table(const Figures& figures, const Sheet& sheet) {
  const double supply = figures.value("supply.power");
  std::vector<std::pair<double, std::string>> rows;
  for (const auto& part : sheet.parts) {
    const double loss = figures.value(part.name + ".loss");
    if (std::isfinite(loss) && part.role != Role::load && std::abs(loss) > 1e-6 * std::abs(supply)) rows.push_back({loss, part.name});
  }
  std::sort(rows.begin(), rows.end(), [](const auto& a, const auto& b) { return a.first > b.first; });
  std::string text;
  for (std::size_t i = 0; i < rows.size() && i < 10; ++i) {
    text += fmt::format("  {:<32}{:>16}   {:5.2f} % of the supply's power\n", rows[i].second, print(rows[i].first, "W"), 100 * rows[i].first / supply);
  }
  return text;
}

bool colour(std::FILE* stream) {
  const char* off = std::getenv("NO_COLOR");
  return (!off || !*off) && isatty(fileno(stream));
}

Progress::Progress(bool quiet) : on_(!quiet && isatty(2)), began_(now()) {}
Progress::~Progress() {
  if (on_ && last_ > 0) std::fprintf(stderr, "\r%*s\r", 78, "");
}
void Progress::operator()(double share) {
  const double t = now();
  if (!on_ || t - last_ < 0.1) return;
  last_ = t;
  share = std::clamp(share, 1e-9, 1.0);
  const int done = static_cast<int>(40 * share);
  const double left = (t - began_) * (1 - share) / share;
  std::fprintf(stderr, "\r  [%s%s] %3.0f %%  %.0f s left   ", std::string(done, '=').c_str(), std::string(40 - done, ' ').c_str(), 100 * share, left);
}

}  // namespace couplet
