// SPDX-License-Identifier: MIT
// The drawing that --plot writes for each command.
#pragma once

#include "engine/record/record.h"
#include "engine/study/follow.h"
#include "engine/study/steady_state.h"

namespace couplet {

/// Rail and largest swings over the whole march (min-max bands a period), from a record.
std::string plot_start(const RecordReader& record, const Design& design);
/// One exact period: rail, voltages and currents of the tank's parts.
std::string plot_settle(const SteadyState& state, const Design& design);
/// Frequency, rail, headroom and efficiency along the path; unstable stretches faint, marks with words.
std::string plot_path(const Path& path, const Design& design);

}  // namespace couplet
