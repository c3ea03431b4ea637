// SPDX-License-Identifier: MIT
// The commands: each returns the exit status.
#pragma once

#include <string>

#include "engine/command/output.h"

namespace couplet {

struct StartCommand {
  CommonOptions common;
  std::string duration, record = "default";
  double tolerance = 1e-6;
};
int start_command(const StartCommand& options);

struct SettleCommand {
  CommonOptions common;
};
int settle_command(const SettleCommand& options);

struct FollowCommand {
  CommonOptions common;
  std::string along, from, to;
};
int follow_command(const FollowCommand& options);

struct CoilCommand {
  std::string file;
  std::vector<std::string> set;
  std::string json, plot, factor;  // factor: the coupling factor whose gap is wanted
  bool force = false, quiet = false;
};
int coil_command(const CoilCommand& options);

struct CaptureCommand {
  std::string file, channel, time_unit, unit;
  std::vector<std::string> probe, readings;
  std::size_t modes = 1;
  std::string from, to, capacitor, probe_capacitance, probe_resistance, series_resistance, closed;
  std::string against, signal, shift, json;
  bool offset = false, force = false, quiet = false;
};
int capture_command(const CaptureCommand& options);

int parts_command(const std::string& kind);

}  // namespace couplet
