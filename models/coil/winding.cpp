// SPDX-License-Identifier: MIT
#include "models/coil/winding.h"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <stdexcept>

namespace couplet::coil {
namespace {

constexpr double litz_packing = 0.5;  // copper in the bundle's circle; common practice 0.4 to 0.6

std::string millimetres(double metres) {
  char text[32];
  std::snprintf(text, sizeof text, "%.4g mm", metres * 1e3);
  return text;
}

double size_in_plane(const Winding& w) {
  if (w.conductor.kind != Conductor::Kind::trace) return w.conductor.bundle();
  return w.flat() ? w.conductor.width : w.conductor.thickness;
}

double size_along_axis(const Winding& w) {
  if (w.conductor.kind != Conductor::Kind::trace) return w.conductor.bundle();
  return w.flat() ? w.conductor.thickness : w.conductor.width;
}

/// How the turns of one layer and the layers lie, worked out from what was given.
struct Lay {
  double in_layer = 0;  // turns in the fullest layer
  int places = 0;       // of turns in that layer
  double pitch = 0, layer_pitch = 0;
  double room = 0;   // m, for the centres of a layer's turns, first to last
  double build = 0;  // m, for the centres of the layers, first to last
};

double room_of_layer(const Winding& w) {
  if (w.shape == Shape::flat_round) return (w.outer_diameter - w.inner_diameter) / 2 - size_in_plane(w);
  if (w.shape == Shape::flat_rectangular) return (w.outer_length - w.inner_length) / 2 - size_in_plane(w);
  return w.length - size_along_axis(w);
}

bool room_given(const Winding& w) {
  if (w.shape == Shape::flat_round) return w.inner_diameter > 0;
  if (w.shape == Shape::flat_rectangular) return w.inner_length > 0;
  return w.length > 0;
}

Lay lay(const Winding& w) {
  Lay made;
  made.in_layer = w.turns / w.layers;
  // A layer of 9.999999 turns is one of 10: the last digits of a division must not add a place.
  made.places = std::max(1, static_cast<int>(std::ceil(made.in_layer - 1e-9)));
  const int gaps = made.places - 1;
  made.pitch = w.pitch > 0 ? w.pitch : (gaps > 0 ? room_of_layer(w) / gaps : 0);
  made.room = made.pitch * gaps;
  made.layer_pitch = w.layer_pitch;
  if (w.layer_pitch <= 0 && w.layers > 1) {
    made.layer_pitch = w.flat()
                           ? size_along_axis(w)
                           : ((w.outer_diameter - w.inner_diameter) / 2 - size_in_plane(w)) / (w.layers - 1);
  }
  made.build = made.layer_pitch * (w.layers - 1);
  return made;
}

void check_conductor(const Conductor& c, std::vector<Problem>& list) {
  if (c.kind == Conductor::Kind::trace) {
    if (!(c.width > 0)) list.push_back({"width", "a trace needs its width; give it, as \"1 mm\""});
    if (!(c.thickness > 0))
      list.push_back({"thickness", "a trace needs its thickness; 35 um is one ounce of copper"});
    return;
  }
  if (!(c.diameter > 0)) list.push_back({"diameter", "the wire or strand needs the diameter of its copper"});
  if (c.strands < 1) list.push_back({"strands", "must be at least 1"});
  if (c.kind == Conductor::Kind::litz && c.bundle_diameter > 0 &&
      c.strands * c.diameter * c.diameter > c.bundle_diameter * c.bundle_diameter)
    list.push_back(
        {"bundle_diameter", "holds less copper than its strands have; measure it over the strands"});
}

void check_sizes(const Winding& w, std::vector<Problem>& list) {
  if (w.shape == Shape::flat_rectangular) {
    if (!(w.outer_length > 0)) list.push_back({"outer_length", "is needed for a rectangular coil"});
    if (!(w.outer_width > 0)) list.push_back({"outer_width", "is needed for a rectangular coil"});
    if (w.corner_radius < 0 || w.corner_radius > std::min(w.outer_length, w.outer_width) / 2)
      list.push_back({"corner_radius", "must lie between 0 and half of the shorter side"});
  } else if (!(w.outer_diameter > 0)) {
    list.push_back({"outer_diameter", "is needed for a round coil"});
  }
  const bool many = w.turns / std::max(w.layers, 1) > 1;
  if (many && !(w.pitch > 0) && !room_given(w)) {
    const std::string other = w.shape == Shape::flat_round         ? "inner_diameter"
                              : w.shape == Shape::flat_rectangular ? "inner_length"
                                                                   : "length";
    list.push_back({other, "give it, or pitch: where the turns lie is not known"});
  }
  if (w.shape == Shape::solenoid && w.layers > 1)
    list.push_back({"layers", "a solenoid has one layer; use the multilayer shape"});
  if (w.shape == Shape::multilayer && w.layers > 1 && !(w.inner_diameter > 0) && !(w.layer_pitch > 0))
    list.push_back({"inner_diameter", "give it, or layer_pitch: where the layers lie is not known"});
}

void check_fit(const Winding& w, std::vector<Problem>& list) {
  const Lay l = lay(w);
  const double step_size = w.flat() ? size_in_plane(w) : size_along_axis(w);
  const double layer_size = w.flat() ? size_along_axis(w) : size_in_plane(w);
  const auto tight = [](double pitch, double size) { return pitch < size * (1 - 1e-9); };
  if (l.places > 1 && tight(l.pitch, step_size))
    list.push_back({"turns", "do not fit: the pitch would be " + millimetres(l.pitch) +
                                 " and the conductor is " + millimetres(step_size) +
                                 " wide; take fewer turns, more room or a thinner conductor"});
  if (w.layers > 1 && tight(l.layer_pitch, layer_size))
    list.push_back({"layers", "do not fit: the layers would be " + millimetres(l.layer_pitch) +
                                  " apart and the conductor is " + millimetres(layer_size) + " high"});
  if (room_given(w) && w.pitch > 0 && l.room > room_of_layer(w) * (1 + 1e-6) + 1e-9)
    list.push_back({"pitch", "with this pitch the turns need " + millimetres(l.room) + " and there are " +
                                 millimetres(room_of_layer(w)) +
                                 "; give either the pitch or the inner size or length"});
  const double build = w.flat() ? l.room : l.build;
  const double outer =
      w.shape == Shape::flat_rectangular ? std::min(w.outer_length, w.outer_width) : w.outer_diameter;
  if (outer / 2 - size_in_plane(w) - build < 0)
    list.push_back(
        {w.flat() ? "turns" : "layers", "reach past the centre of the coil; take fewer, or a larger coil"});
}

}  // namespace

double Conductor::copper_area() const {
  return kind == Kind::trace ? width * thickness
                             : pi / 4 * diameter * diameter * (kind == Kind::litz ? strands : 1);
}

double Conductor::bundle() const {
  if (kind == Kind::wire) return diameter;
  return bundle_diameter > 0 ? bundle_diameter
                             : diameter * std::sqrt(strands == 1 ? 1.0 : strands / litz_packing);
}

std::vector<Problem> problems(const Winding& winding) {
  std::vector<Problem> list;
  check_conductor(winding.conductor, list);
  if (!(winding.turns > 0)) list.push_back({"turns", "must be more than 0"});
  if (winding.turns > 1e4) list.push_back({"turns", "more than 10000 turns are not taken"});
  if (winding.layers < 1) list.push_back({"layers", "must be at least 1"});
  if (winding.pitch < 0 || winding.layer_pitch < 0) list.push_back({"pitch", "must not be negative"});
  if (list.empty()) check_sizes(winding, list);
  if (list.empty()) check_fit(winding, list);
  return list;
}

Coil build(const Winding& w) {
  std::string complaint;
  for (const Problem& p : problems(w)) complaint += (complaint.empty() ? "" : "\n") + p.key + ": " + p.text;
  if (!complaint.empty()) throw std::invalid_argument(complaint);

  const Lay l = lay(w);
  Coil coil;
  coil.conductor = w.conductor;
  coil.across = size_in_plane(w), coil.along = size_along_axis(w);
  const bool rectangular = w.shape == Shape::flat_rectangular;
  const double x = (rectangular ? w.outer_length : w.outer_diameter) / 2 - coil.across / 2;
  const double y = (rectangular ? w.outer_width : w.outer_diameter) / 2 - coil.across / 2;
  const double corner = rectangular ? std::max(w.corner_radius - coil.across / 2, 0.0) : x;
  for (int layer = 0; layer < w.layers; ++layer) {
    for (int place = 0; place < l.places; ++place) {
      const double left = l.in_layer - place;
      const double inset = w.flat() ? place * l.pitch : layer * l.layer_pitch;
      Filament f;
      f.half_length = x - inset, f.half_width = y - inset;
      f.corner = rectangular ? std::max(corner - inset, 0.0) : f.half_length;
      f.height = w.flat() ? layer * l.layer_pitch - l.build / 2 : place * l.pitch - l.room / 2;
      f.turns = left > 1 - 1e-9 ? 1.0 : left;
      coil.filaments.push_back(f);
      coil.wire_length += f.turns * f.length();
    }
  }
  coil.height = (w.flat() ? l.build : l.room) + coil.along;
  coil.reach = rectangular
                   ? std::hypot(w.outer_length / 2 - w.corner_radius, w.outer_width / 2 - w.corner_radius) +
                         w.corner_radius
                   : w.outer_diameter / 2;
  return coil;
}

}  // namespace couplet::coil
