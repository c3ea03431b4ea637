// SPDX-License-Identifier: MIT
// What is wrong with a design as a whole, once each entry has been read.
#pragma once

#include "engine/netlist/complaints.h"
#include "engine/netlist/netlist.h"

namespace couplet {

/// Names, roles, nodes, couplings, contradicting values.
void check_design(const Design& design, Complaints& complaints);
/// The checks that overrides can break: ranges, contradictions, coupling matrix.
void check_values(const Design& design, Complaints& complaints);
/// SI unit of a figure by its name ("rail.max" -> "V"); "1" where it is a ratio or not known.
std::string unit_of_figure(const std::string& figure);
Values values_of(const PartEntry& part);

}  // namespace couplet
