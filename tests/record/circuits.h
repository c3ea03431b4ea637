// SPDX-License-Identifier: MIT
// Small circuits built by hand, and a place for files.
#pragma once

#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <string>

#include "engine/netlist/netlist.h"

namespace couplet::test {

/// A file name of its own, removed at the end.
class Scratch {
 public:
  explicit Scratch(const std::string& name)
      : path_((std::filesystem::temp_directory_path() / ("couplet-" + std::to_string(getpid()) + "-" + name))
                  .string()) {}
  ~Scratch() { std::filesystem::remove(path_); }
  const std::string& path() const { return path_; }

 private:
  std::string path_;
};

inline Design small_design() {
  Design design;
  design.file = "bench.toml";
  design.text = "title = \"Bench\"\n# gr\xc3\xbc\xc3\x9f\n";
  design.sha256 = "0123";
  design.title = "Bench";
  return design;
}

inline void sine_source(Sheet& sheet, const std::string& node, double amplitude, double frequency) {
  const int part = sheet.part("source", "supply", sheet.node(node), 0, Role::source);
  Waveform wave;
  wave.amplitude = amplitude;
  wave.frequency = frequency;
  sheet.emf(part, sheet.node(node), 0, Form().wave(sheet.waveform(wave)));
}

inline void resistor(Sheet& sheet, const std::string& name, const std::string& from, const std::string& to,
                     double ohms) {
  const Node a = sheet.node(from), b = sheet.node(to);
  sheet.resistor(sheet.part(name, "resistor", a, b), a, b, ohms);
}

inline void capacitor(Sheet& sheet, const std::string& name, const std::string& from, const std::string& to,
                      double farads) {
  const Node a = sheet.node(from), b = sheet.node(to);
  sheet.capacitor(sheet.part(name, "capacitor", a, b), a, b, farads, 0);
}

inline void coil(Sheet& sheet, const std::string& name, const std::string& from, const std::string& to,
                 double henries, double ohms) {
  const Node a = sheet.node(from), b = sheet.node(to);
  sheet.coil(sheet.part(name, "coil", a, b), a, b, henries, ohms, 0);
}

/// Piecewise linear: 1 uS when off, 10 S above 0.4 V.
inline void diode(Sheet& sheet, const std::string& name, const std::string& from, const std::string& to) {
  const Node a = sheet.node(from), b = sheet.node(to);
  Branch& branch = sheet.branch(sheet.part(name, "diode", a, b), name, a, b);
  Condition above;
  above.form = Form().volt(a, b).add(-0.4);
  branch.conditions.push_back(above);
  branch.cells.push_back({"off", 1, 0, Form().volt(a, b, 1e-6)});
  branch.cells.push_back({"conducts", 1, 1, Form().volt(a, b, 10).add(-0.4 * (10 - 1e-6))});
}

/// 10 V, 100 kHz, through 1 ohm and 2 uH into two diodes that charge a capacitor up and another one down.
/// Probe 0 rises with the source.
inline Sheet two_diodes() {
  Sheet sheet;
  sine_source(sheet, "in", 10, 1e5);
  resistor(sheet, "series", "in", "mid", 1);
  coil(sheet, "choke", "mid", "ac", 2e-6, 0.01);
  capacitor(sheet, "stray", "ac", "gnd", 1e-9);
  diode(sheet, "upper", "ac", "plus");
  diode(sheet, "lower", "minus", "ac");
  for (const char* rail : {"plus", "minus"}) {
    capacitor(sheet, std::string(rail) + "_filter", rail, "gnd", 1e-6);
    resistor(sheet, std::string(rail) + "_load", rail, "gnd", 100);
  }
  sheet.probes.push_back({"source rises", Form().volt(sheet.node("in"), 0)});
  return sheet;
}

}  // namespace couplet::test
