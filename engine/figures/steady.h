// SPDX-License-Identifier: MIT
// The figures of a window of running: named numbers from extremes, energies and means.
#pragma once

#include "engine/figures/energy.h"
#include "engine/figures/extremes.h"
#include "engine/figures/figure.h"

namespace couplet {

/// What a window saw. `integrals` as in energy.h.
struct WindowData {
  double duration = 0;     // s
  double periods = 0;      // whole periods in it; 0: unknown
  std::vector<Eigen::MatrixXd> integrals;
  double stored_before = 0, stored_after = 0;
};

/// frequency, period, supply.power, load.power, efficiency, rail.*, regulator.*, ledger.residual and, for each part,
/// loss, power, voltage.peak, current.peak, current.rms, current.mean. Powers are means over the window, W; supply.power
/// is what leaves the supplies' terminals.
Figures window_figures(const Quantities& quantities, const Extremes& extremes, const WindowData& window);

}  // namespace couplet
