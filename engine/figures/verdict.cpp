// SPDX-License-Identifier: MIT
#include "engine/figures/verdict.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "engine/quantity/quantity.h"

namespace couplet {
namespace {

void fill(Verdict& v, const Figures& figures) {
  const Figure* figure = figures.find(v.figure);
  if (!figure || !std::isfinite(figure->value)) {
    v.status = Verdict::Status::not_judged;
    if (v.why.empty()) v.why = "this run has no such figure";
    return;
  }
  v.value = figure->value;
  v.unit = figure->unit;
  v.when = figure->when;
  const double below = v.at_most ? *v.at_most - v.value : std::numeric_limits<double>::infinity();
  const double above = v.at_least ? v.value - *v.at_least : std::numeric_limits<double>::infinity();
  v.margin = std::min(below, above);
  const double limit = below < above ? *v.at_most : *v.at_least;
  v.margin_percent = limit != 0 ? 100 * v.margin / std::abs(limit) : std::numeric_limits<double>::quiet_NaN();
  v.status = v.margin >= 0 ? Verdict::Status::met : Verdict::Status::not_met;
}

}  // namespace

std::string status_word(Verdict::Status status) {
  switch (status) {
    case Verdict::Status::met: return "met";
    case Verdict::Status::not_met: return "not met";
    default: return "not judged";
  }
}

std::vector<Verdict> judge(const Design& design, const Sheet& sheet, const Figures& figures) {
  std::vector<Verdict> verdicts;
  for (const auto& limit : design.limits) {
    Verdict v;
    v.name = limit.name;
    v.figure = limit.figure;
    if (limit.at_least) v.at_least = limit.at_least->value;
    if (limit.at_most) v.at_most = limit.at_most->value;
    v.why = limit.why;
    v.source = limit.source;
    fill(v, figures);
    verdicts.push_back(v);
  }
  for (const auto& part : design.parts) {
    for (const auto& rating : part.kind->ratings) {
      const auto given = part.ratings.find(rating.name);
      for (const auto& piece : sheet.parts) {
        if (piece.name != part.name && piece.name.rfind(part.name + ".", 0) != 0) continue;
        if (!rating.of.empty() && piece.kind != rating.of) continue;
        Verdict v;
        v.name = piece.name + " " + rating.name;
        v.figure = piece.name + "." + rating.figure;
        // Over a whole start the highest value counts, not only that of the last periods.
        for (const auto& [last, highest] : {std::pair{"voltage.peak", "voltage.highest"}, std::pair{"current.peak", "current.highest"}}) {
          if (rating.figure == last && figures.find(piece.name + "." + highest)) v.figure = piece.name + "." + highest;
        }
        v.unit = rating.unit;
        if (given == part.ratings.end()) {
          v.why = "no rating is given";
        } else {
          v.at_most = given->second.value * design.derating;
          v.why = design.derating == 1 ? "rating" : fmt::format("rating {} at {:.0f} %", print_quantity(given->second.value, rating.unit), 100 * design.derating);
          v.source = given->second.origin;
          fill(v, figures);
        }
        verdicts.push_back(v);
      }
    }
  }
  std::stable_sort(verdicts.begin(), verdicts.end(), [](const Verdict& a, const Verdict& b) {
    const auto rank = [](const Verdict& v) { return v.status == Verdict::Status::not_met ? 0 : v.status == Verdict::Status::met ? 1 : 2; };
    if (rank(a) != rank(b)) return rank(a) < rank(b);
    const double ma = std::isfinite(a.margin_percent) ? a.margin_percent : 1e300, mb = std::isfinite(b.margin_percent) ? b.margin_percent : 1e300;
    return ma < mb;
  });
  return verdicts;
}

bool all_met(const std::vector<Verdict>& verdicts) {
  return std::none_of(verdicts.begin(), verdicts.end(), [](const Verdict& v) { return v.status == Verdict::Status::not_met; });
}

}  // namespace couplet
