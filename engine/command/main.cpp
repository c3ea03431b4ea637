// SPDX-License-Identifier: MIT
// The program: read the call, run one command, turn errors into one message and a status.
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <csignal>

#include "engine/circuit/circuit.h"
#include "engine/command/commands.h"
#include "engine/record/hdf5_file.h"

namespace {

using couplet::CommonOptions;

void add_common(CLI::App* command, CommonOptions& common) {
  command->add_option("NETLIST", common.netlist, "the design, a TOML file")->required();
  command->add_option("--set", common.set, "NAME=VALUE: another value for a given value or PART.KEY, with its unit");
  command->add_option("--out", common.out, "where the record goes (an existing file is kept unless --force)");
  command->add_option("--json", common.json, "figures and verdicts as JSON to this path; - for standard output");
  command->add_option("--plot", common.plot, "one drawing as SVG to this path");
  command->add_option("--march", common.march, "exact, or ida for the second opinion")->check(CLI::IsMember({"exact", "ida"}));
  command->add_flag("--force", common.force, "overwrite existing files");
  command->add_flag("--quiet", common.quiet, "no summary, no progress");
  command->add_flag("--verbose", common.verbose, "every part's figures, counts and times");
}

void add_capture(CLI::App* command, couplet::CaptureCommand& capture) {
  command->add_option("CSV", capture.file, "the capture, as the oscilloscope wrote it");
  command->add_option("--channel", capture.channel, "which channel, where the file holds several");
  command->add_option("--time-unit", capture.time_unit, "unit of time where the file states none, like us");
  command->add_option("--unit", capture.unit, "unit of the values where the file states none, like V");
  command->add_option("--probe", capture.probe, "true factor of the probe: 10, or CHANNEL=10");
  command->add_option("--modes", capture.modes, "how many oscillations ring at once")->check(CLI::Range(1, 4));
  command->add_option("--from", capture.from, "start of the ring-down, with its unit; else it is searched");
  command->add_option("--to", capture.to, "its end");
  command->add_option("--capacitor", capture.capacitor, "the known capacitor, like \"47 nF +- 2 %\": gives inductance and resistance");
  command->add_option("--probe-capacitance", capture.probe_capacitance, "adds to the capacitor, like \"12 pF +- 3 pF\"");
  command->add_option("--probe-resistance", capture.probe_resistance, "across the capacitor, like \"10 Mohm\"");
  command->add_option("--series-resistance", capture.series_resistance, "of capacitor and leads, not the coil's, like \"20 mohm +- 5 mohm\"");
  command->add_option("--closed", capture.closed, "a second capture, with the other coil shorted: gives the coupling factor");
  command->add_option("--reading", capture.readings, "NAME=\"VALUE +- ERROR\", as often as needed: open, short; aiding, opposing, first, second; first-voltage, second-voltage; low, high, first-alone, second-alone; first-quality, second-quality");
  command->add_option("--against", capture.against, "a record: lay the capture over one of its signals");
  command->add_option("--signal", capture.signal, "which one, like \"voltage of tank\"");
  command->add_option("--shift", capture.shift, "add this to the capture's time instead of searching for it");
  command->add_flag("--offset", capture.offset, "also take out a constant difference");
  command->add_option("--json", capture.json, "figures as JSON to this path; - for standard output");
  command->add_flag("--force", capture.force, "overwrite existing files");
  command->add_flag("--quiet", capture.quiet, "no summary");
  command->footer("Example: couplet capture ring.csv --capacitor \"47 nF +- 2 %\" --probe-capacitance \"12 pF +- 3 pF\"");
}

}  // namespace

int main(int argc, char** argv) {
  CLI::App app{"Couplet: checks an inductive charging link in the time domain, before coils and boards are ordered.\n"
               "Exit status: 0 all limits met; 1 a limit is not met; 2 the input or the call is wrong; 3 not finished."};
  app.set_version_flag("--version", COUPLET_VERSION);
  app.require_subcommand(1);
  app.footer("Example: couplet start netlists/dock.toml --set load=\"20 ohm\"");

  couplet::StartCommand start;
  auto* start_app = app.add_subcommand("start", "march from rest through the supply's rise and the schedule");
  add_common(start_app, start.common);
  start_app->add_option("--duration", start.duration, "how long to march, like \"5 ms\"");
  start_app->add_option("--tolerance", start.tolerance, "relative tolerance of the ida march")->check(CLI::Range(1e-13, 1e-2));
  start_app->add_option("--record", start.record, "default keeps detail at the start, around changes and at the end; all keeps everything")->check(CLI::IsMember({"default", "all"}));
  start_app->footer("Example: couplet start netlists/dock.toml --set rise=\"20 ms\" --json -");

  couplet::SettleCommand settle;
  auto* settle_app = app.add_subcommand("settle", "find the periodic steady state, its stability and its figures");
  add_common(settle_app, settle.common);
  settle_app->footer("Example: couplet settle netlists/dock.toml --set factor=0.2 --verbose");

  couplet::FollowCommand follow;
  auto* follow_app = app.add_subcommand("follow", "follow the settled state along one value, through folds");
  add_common(follow_app, follow.common);
  follow_app->add_option("--along", follow.along, "a given value or PART.KEY")->required();
  follow_app->add_option("--from", follow.from, "first value, with its unit")->required();
  follow_app->add_option("--to", follow.to, "last value, with its unit")->required();
  follow_app->footer("Example: couplet follow netlists/dock.toml --along load --from \"60 ohm\" --to \"6 ohm\"");
  couplet::CoilCommand coil;
  auto* coil_app = app.add_subcommand("coil", "inductance, coupling, resistance and field of coils from their geometry");
  coil_app->add_option("FILE", coil.file, "the coils, a TOML file")->required();
  coil_app->add_option("--set", coil.set, "TABLE.KEY=VALUE: another value, with its unit");
  coil_app->add_option("--factor", coil.factor, "also find the gap at which the coils have this coupling factor");
  coil_app->add_option("--json", coil.json, "everything as JSON to this path; - for standard output");
  coil_app->add_option("--plot", coil.plot, "coupling factor over gap and shift as SVG to this path");
  coil_app->add_flag("--force", coil.force, "overwrite existing files");
  coil_app->add_flag("--quiet", coil.quiet, "no summary");
  coil_app->footer("Example: couplet coil netlists/coils/tool_crib_pad.toml --set place.gap=\"3 mm\" --factor 0.3");

  couplet::CaptureCommand capture;
  auto* capture_app = app.add_subcommand("capture", "part values from bench captures and readings; or a capture over a record");
  add_capture(capture_app, capture);

  std::string kind;
  auto* parts_app = app.add_subcommand("parts", "which kinds of parts there are, with keys, units and defaults");
  parts_app->add_option("KIND", kind, "show one kind in full");
  parts_app->footer("Example: couplet parts fet");

  try {
    app.parse(argc, argv);
  } catch (const CLI::ParseError& error) {
    const int code = app.exit(error);
    return code == 0 ? 0 : couplet::status_input;
  }
  try {
    if (*start_app) return couplet::start_command(start);
    if (*settle_app) return couplet::settle_command(settle);
    if (*follow_app) return couplet::follow_command(follow);
    if (*coil_app) return couplet::coil_command(coil);
    if (*capture_app) return couplet::capture_command(capture);
    if (*parts_app) return couplet::parts_command(kind);
  } catch (const couplet::InputError& error) {
    fmt::print(stderr, "{}\n", error.what());
    return couplet::status_input;
  } catch (const couplet::RecordError& error) {
    fmt::print(stderr, "{}\n", error.what());
    return couplet::status_input;
  } catch (const couplet::CircuitError& error) {
    fmt::print(stderr, "{}: {}\n", start.common.netlist, error.what());
    return couplet::status_input;
  } catch (const std::exception& error) {
    fmt::print(stderr, "couplet: an error of the program itself: {}\n", error.what());
    return couplet::status_unfinished;
  }
  return couplet::status_input;
}
