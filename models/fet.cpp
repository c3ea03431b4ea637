// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind fet_kind = {
    "fet",
    "a field-effect transistor in three regions (off, saturated, on) with body diode and capacitances",
    {{"drain", "current enters here when it is on"},
     {"gate", "its voltage above the source opens the channel"},
     {"source", "and leaves here; the body diode conducts from here to the drain"}},
    fet_keys(),
    two_terminal_ratings(),
    R"(kind = "fet"
drain = "left"
gate = "gate_left"
source = "gnd"
threshold = { value = "2.0 V", tolerance = "20 %" })",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const int part = sheet.part(name, "fet", n.at("drain"), n.at("source"));
      write_fet(sheet, part, name, n.at("drain"), n.at("gate"), n.at("source"), v);
    }};

}  // namespace couplet
