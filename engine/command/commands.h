// SPDX-License-Identifier: MIT
// The commands: each returns the exit status.
#pragma once

#include <string>

#include "engine/command/output.h"

namespace couplet {

struct StartCommand {
  CommonOptions common;
  std::string duration, from = "rest", record = "default";
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

int parts_command(const std::string& kind);

}  // namespace couplet
