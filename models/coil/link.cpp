// SPDX-License-Identifier: MIT
#include "models/coil/link.h"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <stdexcept>

#include "models/coil/self.h"

namespace couplet::coil {
namespace {

Coil build_named(const Winding& winding, const std::string& which, std::string& complaint) {
  std::string lines;
  for (const Problem& p : problems(winding))
    lines += (lines.empty() ? "" : "\n") + which + ": " + p.key + ": " + p.text;
  if (lines.empty()) return build(winding);
  complaint += (complaint.empty() ? "" : "\n") + lines;
  return {};
}

/// Images of a coil in its own sheet, in its own frame: what its copper sees of the sheet whatever the other
/// coil does.
std::vector<Image> own_images(const Coil& coil, const std::optional<Plane>& behind) {
  Surroundings own;
  own.behind_first = behind;
  return images(own, coil, coil, {}, 1);
}

std::pair<Coil, Coil> build_both(const Winding& first, const Winding& second) {
  std::string complaint;
  std::pair<Coil, Coil> both{build_named(first, "first", complaint),
                             build_named(second, "second", complaint)};
  if (!complaint.empty()) throw std::invalid_argument(complaint);
  return both;
}

}  // namespace

Link::Link(const Winding& first, const Winding& second, const Surroundings& sheets)
    : first_(build_both(first, second).first),
      second_(build(second)),
      sheets_(sheets),
      alone_{self_inductance(first_), self_inductance(second_)},
      first_alone_(first_, own_images(first_, sheets.behind_first)),
      second_alone_(second_, own_images(second_, sheets.behind_second)) {}

LinkValues Link::at(const Placement& place, double frequency, double celsius, double tolerance) const {
  const Pose p = pose(first_, second_, place);
  const std::string touching = collision(first_, second_, p);
  if (!touching.empty()) throw std::invalid_argument(touching);
  const Inductances l = inductances(first_, second_, p, sheets_, tolerance, alone_);
  const Impedance one = first_alone_.at(frequency, celsius), two = second_alone_.at(frequency, celsius);
  LinkValues v;
  v.first = l.first.value + one.inductance_change, v.second = l.second.value + two.inductance_change;
  v.mutual = l.mutual.value;
  const double scale = std::sqrt(v.first * v.second);
  v.coupling = v.mutual / scale;
  v.first_resistance = one.resistance, v.second_resistance = two.resistance;
  v.first_resistance_dc = first_alone_.dc(celsius), v.second_resistance_dc = second_alone_.dc(celsius);
  v.error = (l.first.error + l.second.error + l.mutual.error) / scale;
  v.notes = validity(sheets_, first_, second_, place.tilt);
  for (const Resistance* r : {&first_alone_, &second_alone_})
    for (const std::string& note : r->limits(frequency, celsius))
      if (std::find(v.notes.begin(), v.notes.end(), note) == v.notes.end()) v.notes.push_back(note);
  return v;
}

double best_efficiency(double coupling, double first_quality, double second_quality) {
  const double x = coupling * coupling * first_quality * second_quality, root = 1 + std::sqrt(1 + x);
  return x / (root * root);
}

LinkValues link_values(const LinkGeometry& g, double frequency, double celsius) {
  return Link(g.first, g.second, g.sheets).at(g.place, frequency, celsius);
}

std::vector<TableRow> tabulate(const LinkGeometry& g, const std::vector<double>& gaps,
                               const std::vector<double>& shifts, const std::vector<double>& tilts,
                               double frequency, double celsius) {
  const Link link(g.first, g.second, g.sheets);
  std::vector<TableRow> rows;
  for (const double gap : gaps)
    for (const double shift : shifts)
      for (const double tilt : tilts) {
        Placement place = g.place;
        place.gap = gap, place.shift = shift, place.tilt = tilt;
        try {
          rows.push_back({{gap, shift, tilt}, link.at(place, frequency, celsius).pair()});
        } catch (const std::invalid_argument& error) {
          char text[120];
          std::snprintf(text, sizeof text, "at gap %.6g mm, shift %.6g mm, tilt %.6g deg: ", gap * 1e3,
                        shift * 1e3, tilt * 180 / pi);
          throw std::invalid_argument(text + std::string(error.what()));
        }
      }
  return rows;
}

}  // namespace couplet::coil
