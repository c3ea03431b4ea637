// SPDX-License-Identifier: MIT
// What commands print: tables for people, JSON for machines, progress on a terminal.
#pragma once

#include <cstdio>
#include <string>
#include <vector>

#include "engine/figures/verdict.h"
#include "engine/netlist/netlist.h"

namespace couplet {

/// Options that every command takes.
struct CommonOptions {
  std::string netlist;
  std::vector<std::string> set;
  std::string out, json, march = "exact", plot;
  bool force = false, quiet = false, verbose = false;
};

/// Exit statuses: what the shell sees.
enum Status { status_met = 0, status_not_met = 1, status_input = 2, status_unfinished = 3 };

/// A JSON value under construction; texts are escaped, numbers that are not finite become null.
class Json {
 public:
  Json& open(char bracket) { return separate(), text_ += bracket, fresh_ = true, *this; }
  Json& close(char bracket) { return text_ += bracket, fresh_ = false, *this; }
  Json& key(const std::string& name);
  Json& value(const std::string& text);
  Json& value(const char* text) { return value(std::string(text)); }
  Json& value(double number);
  Json& value(long number);
  Json& value(bool truth);
  const std::string& text() const { return text_; }

 private:
  void separate();
  std::string text_;
  bool fresh_ = true, after_key_ = false;
};

/// The object of design.md: design, command, version, netlist_sha256, status, figures, verdicts; `more` adds to it.
std::string json_of(const Design& design, const std::string& command, int status, const Figures& figures, const std::vector<Verdict>& verdicts,
                    const std::string& more = "");
/// To a file by way of a temporary name, or to standard output for "-". Throws InputError.
void write_text(const std::string& path, const std::string& text);

/// Name, value, and when; figures of parts are left out unless `parts`.
std::string figure_table(const Figures& figures, bool parts);
std::string verdict_table(const std::vector<Verdict>& verdicts, bool verbose);
/// Where the supply's power goes, largest first.
std::string loss_table(const Figures& figures, const Sheet& sheet);

bool colour(std::FILE* stream);
/// Shows a bar with the time left on standard error, only on a terminal.
class Progress {
 public:
  explicit Progress(bool quiet);
  ~Progress();
  void operator()(double share);

 private:
  bool on_;
  double began_, last_ = 0;
};

}  // namespace couplet
