// SPDX-License-Identifier: MIT
// A coil as a drawing gives it, and its reduction to filaments: one per turn, at the centre of the conductor.
// A spiral is taken as concentric turns and a helix as stacked ones, which leaves out the lead-in and the
// slope of a turn.
#pragma once

#include <string>
#include <vector>

#include "models/coil/filament.h"

namespace couplet::coil {

struct Conductor {
  enum class Kind { wire, litz, trace };
  Kind kind = Kind::wire;
  double diameter = 0;  // m; copper of the wire, or of one strand of litz
  int strands = 1;      // of litz
  double bundle_diameter =
      0;                 // m, of litz; 0: from the strands, half of the bundle being copper (common practice)
  double width = 0;      // m, of a trace: in the plane of a flat coil, along the axis of a solenoid
  double thickness = 0;  // m, of a trace

  double copper_area() const;  // m2
  double bundle() const;       // m, outer diameter of a wire or a litz bundle
};

enum class Shape { flat_round, flat_rectangular, solenoid, multilayer };

/// All sizes are over copper, edge to edge. Zero means: not given, and is worked out where it says so.
struct Winding {
  Shape shape = Shape::flat_round;
  Conductor conductor;
  double turns = 0;           // of all layers together; need not be whole
  double outer_diameter = 0;  // m; round shapes
  double inner_diameter = 0;  // m; flat_round (or pitch instead), multilayer (or layer_pitch instead)
  double outer_length = 0;    // m, along x; flat_rectangular
  double outer_width = 0;     // m, along y; flat_rectangular
  double inner_length = 0;    // m; flat_rectangular (or pitch instead)
  double corner_radius = 0;   // m, of the outermost copper edge; flat_rectangular
  double length = 0;          // m, along the axis; solenoid and multilayer (or pitch instead)
  double pitch = 0;           // m, centre to centre of neighbouring turns in one layer
  int layers = 1;             // flat: stacked along the axis; multilayer: one around another
  double layer_pitch =
      0;  // m, centre to centre of layers; 0: touching (flat), spread over the build (multilayer)

  bool flat() const { return shape == Shape::flat_round || shape == Shape::flat_rectangular; }
};

/// What is wrong with one key of a winding, and what to do.
struct Problem {
  std::string key, text;
};

/// Empty where the winding can be built.
std::vector<Problem> problems(const Winding& winding);

/// A winding ready for computing. Its frame: z along the axis, origin in the middle of the copper.
struct Coil {
  std::vector<Filament> filaments;
  Conductor conductor;
  double across = 0;       // m, extent of the conductor in the plane of the turn
  double along = 0;        // m, extent of the conductor along the axis
  double height = 0;       // m, copper along the axis, face to face
  double reach = 0;        // m, largest distance of copper from the axis
  double wire_length = 0;  // m
};

/// Throws std::invalid_argument with all problems, one a line.
Coil build(const Winding& winding);

}  // namespace couplet::coil
