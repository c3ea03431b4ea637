// SPDX-License-Identifier: MIT
// The one list of parts.
#include "models/schema.h"

namespace couplet {

extern const PartKind supply_kind, current_source_kind, resistor_kind, capacitor_kind, coil_kind,
    transformer_kind, diode_kind, clamp_kind, fet_kind, switch_kind, push_pull_kind, half_bridge_kind,
    full_bridge_kind, bridge_kind, regulator_kind, load_resistor_kind, load_current_kind, load_power_kind,
    load_battery_kind, load_led_kind;

const std::vector<PartKind>& catalogue() {
  static const std::vector<PartKind> list = {
      supply_kind,        current_source_kind, resistor_kind,    capacitor_kind,    coil_kind,
      transformer_kind,   diode_kind,          clamp_kind,       fet_kind,          switch_kind,
      push_pull_kind,     half_bridge_kind,    full_bridge_kind, bridge_kind,       regulator_kind,
      load_resistor_kind, load_current_kind,   load_power_kind,  load_battery_kind, load_led_kind};
  return list;
}

const PartKind* find_kind(const std::string& kind) {
  for (const auto& k : catalogue()) {
    if (k.kind == kind) return &k;
  }
  return nullptr;
}

}  // namespace couplet
