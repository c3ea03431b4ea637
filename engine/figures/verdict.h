// SPDX-License-Identifier: MIT
// Limits turn figures into verdicts.
#pragma once

#include "engine/figures/figure.h"
#include "engine/netlist/netlist.h"

namespace couplet {

struct Verdict {
  enum class Status { met, not_met, not_judged };
  std::string name, figure, unit;
  Status status = Status::not_judged;
  double value = std::numeric_limits<double>::quiet_NaN();
  std::optional<double> at_least, at_most;
  double margin = std::numeric_limits<double>::quiet_NaN();          // in the unit; negative where the limit is broken
  double margin_percent = std::numeric_limits<double>::quiet_NaN();  // of the limit
  std::optional<double> when;                                        // s
  std::string why, source;
};

/// Verdicts of all limits and of all ratings (at the netlist's derating), worst margin first; those not judged last.
std::vector<Verdict> judge(const Design& design, const Sheet& sheet, const Figures& figures);
std::string status_word(Verdict::Status status);
bool all_met(const std::vector<Verdict>& verdicts);

}  // namespace couplet
