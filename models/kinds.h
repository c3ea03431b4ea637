// SPDX-License-Identifier: MIT
// Every kind of part, for the catalogue.
#pragma once

#include "models/schema.h"

namespace couplet {
extern const PartKind resistor_kind, capacitor_kind, coil_kind, transformer_kind, diode_kind, clamp_kind,
    fet_kind, switch_kind, half_bridge_kind, full_bridge_kind, bridge_kind, push_pull_kind, supply_kind,
    current_source_kind, regulator_kind, load_resistor_kind, load_current_kind, load_power_kind,
    load_battery_kind, load_led_kind;
}  // namespace couplet
