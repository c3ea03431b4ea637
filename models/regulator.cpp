// SPDX-License-Identifier: MIT
// Linear regulator: pass current i = clamp((min(set, v_in - dropout) - v_out) / resistance, 0, limit) while
// enabled.
#include "models/pieces.h"

namespace couplet {

extern const PartKind regulator_kind = {
    "regulator",
    "a linear regulator: set voltage, dropout, current limit, quiescent current, turn-on threshold",
    {{"input", "unregulated input"}, {"output", "regulated output"}, {"common", "ground pin"}},
    {{"output_voltage", "V", "set voltage", "", 1e-3, 1e4},
     {"dropout", "V", "input must exceed the output by this (hot, at full current)", "0.3 V", 0, 100},
     {"resistance", "ohm", "output resistance", "20 mohm", 1e-6, 1e6},
     {"current_limit", "A", "largest pass current", "2 A", 1e-9, 1e6},
     {"quiescent", "A", "current to the ground pin", "1 mA", 0, 1e3},
     {"turn_on", "V", "input voltage at which it starts; 0: always on", "0 V", 0, 1e4},
     {"turn_off", "V", "input voltage at which it stops again", "0 V", 0, 1e4}},
    {{"input", "V", "voltage.peak", "absolute maximum input voltage"},
     {"current", "A", "current.peak", "largest input current"},
     {"power", "W", "loss", "mean loss"}},
    R"(kind = "regulator"
input = "rail"
output = "vout"
common = "gnd"
output_voltage = "5 V"
dropout = "0.3 V"
turn_on = "6 V"
turn_off = "5 V")",
    [](Sheet& sheet, const std::string& name, const Nodes& n, const Values& v) {
      const Node in = n.at("input"), out = n.at("output"), common = n.at("common");
      const int part = sheet.part(name, "regulator", in, common);
      auto& me = sheet.parts[part];
      me.input = in, me.output = out, me.common = common;
      me.dropout = v["dropout"], me.output_voltage = v["output_voltage"];
      const double g = 1 / v["resistance"], set = v["output_voltage"], drop = v["dropout"],
                   limit = v["current_limit"];
      Branch& b = sheet.branch(part, name, in, out);
      Condition below_set, below_input, ample, set_free, drop_free, enabled;
      below_set.form.add(set).volt(out, common, -1);            // 0: set - v_out > 0
      below_input.form.volt(in, out).add(-drop);                // 1: v_in - dropout - v_out > 0
      ample.form.volt(in, common).add(-drop - set);             // 2: v_in - dropout > set
      set_free.form.add(limit / g - set).volt(out, common, 1);  // 3: below the limit when regulating
      drop_free.form.add(limit / g + drop).volt(in, out, -1);   // 4: below the limit in dropout
      b.conditions = {below_set, below_input, ample, set_free, drop_free};
      const Form none, regulated = Form().add(g * set).volt(out, common, -g),
                       dropped = Form().volt(in, out, g).add(-g * drop);
      const Form limited = Form().add(limit);
      std::uint32_t on = 0;
      if (v["turn_on"] > 0) {
        enabled.form.volt(in, common).add(-v["turn_on"]);
        enabled.hysteresis = true;
        enabled.held.volt(in, common).add(-v["turn_off"]);
        b.conditions.push_back(enabled);
        on = 1U << 5;
        b.cells.push_back({"disabled", on, 0, none});
      }
      b.cells.push_back({"idle", on | 1, on | 0, none});
      b.cells.push_back({"idle", on | 3, on | 1, none});
      b.cells.push_back({"regulates", on | 0xF, on | 0xF, regulated});
      b.cells.push_back({"limits", on | 0xF, on | 0x7, limited});
      b.cells.push_back({"drops out", on | 0x17, on | 0x13, dropped});
      b.cells.push_back({"limits", on | 0x17, on | 0x3, limited});
      // Rises through zero with the input, constant above a tenth of the set voltage.
      if (v["quiescent"] > 0)
        write_draw(sheet, part, name + ".quiescent", in, common, v["quiescent"], 0.1 * set,
                   {"starved", "full"});
    },
    [](const Values& v) -> std::string {
      if (v["turn_on"] > 0 && v["turn_off"] >= v["turn_on"])
        return "turn_off must lie below turn_on; lower it";
      return {};
    }};

}  // namespace couplet
