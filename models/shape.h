// SPDX-License-Identifier: MIT
// What a source does over time: steady (with a rise), sine, pulses, or a table.
#pragma once

#include "models/schema.h"

namespace couplet {

/// `level` is the key of the steady value, the sine's amplitude or the pulses' upper level, in `unit`.
std::vector<Key> shape_keys(const std::string& level, const std::string& unit);
/// For PartKind::check.
std::string check_shape(const Values& values, const std::string& level);
/// The value over time as a form: a constant where it never changes, otherwise a waveform put onto the sheet.
Form shape_value(Sheet& sheet, const Values& values, const std::string& level);

}  // namespace couplet
