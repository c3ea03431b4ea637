// SPDX-License-Identifier: MIT
#include "models/pieces.h"

namespace couplet {

extern const PartKind transformer_kind = {
    "transformer",
    "an ideal transformer: no leakage, no magnetising current",
    {{"first", "list of the two nodes of the first winding; the first is its dotted end"},
     {"second", "list of the two nodes of the second winding; the first is its dotted end"}},
    {{"ratio", "1", "voltage of the first winding over that of the second", "1", 1e-9, 1e9}},
    {},
    R"(kind = "transformer"
first = ["a", "b"]
second = ["c", "gnd"]
ratio = "2")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      Transformer t;
      t.part = sheet.part(name, "transformer", n.at("first.0"), n.at("first.1"));
      t.name = name;
      t.a = n.at("first.0"), t.b = n.at("first.1"), t.c = n.at("second.0"), t.d = n.at("second.1");
      t.ratio = v["ratio"];
      sheet.transformers.push_back(t);
    }};

}  // namespace couplet
