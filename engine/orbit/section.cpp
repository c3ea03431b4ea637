// SPDX-License-Identifier: MIT
#include "engine/orbit/section.h"

#include <fmt/format.h>

#include <cmath>

#include "engine/march/exact.h"

namespace couplet {
namespace {

/// Least common period, or 0 where there is none within a thousand periods of the slowest.
double common_period(const std::vector<double>& periods) {
  double longest = 0;
  for (double p : periods) longest = std::max(longest, p);
  for (int n = 1; n <= 1000; ++n) {
    bool fits = true;
    for (double p : periods) {
      const double ratio = n * longest / p;
      fits = fits && std::abs(ratio - std::round(ratio)) < 1e-9 * ratio;
    }
    if (fits) return n * longest;
  }
  return 0;
}

struct Candidate {
  Form form;
  std::string name;
  double weight = 0;  // energy per square of the quantity
  double low = 0, high = 0;
};

/// Smallest and largest value of each candidate at the ends of spans.
class Swings : public Observer {
 public:
  Swings(const Circuit& circuit, std::vector<Candidate>& candidates) : circuit_(circuit), candidates_(candidates) {}
  void span(const Span& span) override {
    const Eigen::Map<const Eigen::VectorXd> x(span.x1, circuit_.size());
    w_.noalias() = span.topology->C * x;
    for (auto& c : candidates_) {
      const double v = circuit_.evaluate(c.form, w_, x.tail(circuit_.inputs()));
      c.low = std::min(c.low, v);
      c.high = std::max(c.high, v);
    }
  }

 private:
  const Circuit& circuit_;
  std::vector<Candidate>& candidates_;
  Eigen::VectorXd w_;
};

}  // namespace

double natural_period(const Circuit& circuit) {
  ExactMarch march(circuit, {});
  const MarchState state = march.stand(circuit.start_state(), 0);
  const Topology& topology = circuit.topology(state.cells);
  const Eigen::MatrixXd A = topology.A.topLeftCorner(circuit.states(), circuit.states());
  if (A.size() == 0) return 0;
  const Eigen::VectorXcd rates = A.eigenvalues();
  double ring = 0, decay = 0;
  for (int i = 0; i < rates.size(); ++i) {
    const double re = std::abs(rates[i].real()), im = std::abs(rates[i].imag());
    if (im > re) ring = std::max(ring, 2 * M_PI / im);
    if (re > 0) decay = std::max(decay, 1 / re);
  }
  return ring > 0 ? ring : decay;
}

Section find_section(const Sheet& sheet, const std::string& wanted, double patience) {
  Section section;
  std::vector<double> periods;
  for (const auto& c : sheet.commands) periods.push_back(1 / c.frequency);
  for (const auto& w : sheet.waveforms) {
    if (w.points.empty() && w.frequency > 0 && w.amplitude != 0) periods.push_back(1 / w.frequency);
    if (!w.points.empty() && w.period > 0) periods.push_back(w.period);
  }
  if (!periods.empty()) {
    section.driven = true;
    section.period = common_period(periods);
    section.words = "the common period of the commands and waveforms";
    if (section.period == 0) section.problem = "the frequencies of the commands and waveforms have no common period within 1000 of the slowest; make their ratios simple fractions";
    return section;
  }
  std::vector<Candidate> candidates;
  for (const auto& c : sheet.capacitors) candidates.push_back({Form().volt(c.from, c.to), "voltage of " + c.name, c.capacitance});
  for (int i = 0; i < static_cast<int>(sheet.coils.size()); ++i) {
    candidates.push_back({Form().current(i), "current of " + sheet.coils[i].name, sheet.coils[i].inductance});
  }
  if (!wanted.empty()) {
    for (const auto& p : sheet.parts) {
      if (p.name != wanted) continue;
      section.form = Form().volt(p.plus, p.minus);
      section.words = fmt::format("voltage of {} rises through zero", wanted);
      return section;
    }
    section.problem = fmt::format("section names \"{}\", which is no part", wanted);
    return section;
  }
  const Circuit circuit(sheet);
  ExactMarch march(circuit, {});
  MarchState state = march.stand(circuit.start_state(), 0);
  // The second half of the while, so that a start-up surge does not pass for a swing.
  march.run(state, patience / 2, nullptr);
  Swings swings(circuit, candidates);
  march.run(state, patience, &swings);
  const Candidate* best = nullptr;
  double most = 0;
  for (const auto& c : candidates) {
    if (!(c.low < 0 && c.high > 0)) continue;
    const double balance = -c.low / c.high;
    if (balance < 0.25 || balance > 4) continue;
    // A coil's current swings as much as its capacitor's voltage; voltages are preferred, being what a probe sees.
    const double energy = c.weight * (c.high - c.low) * (c.high - c.low) * (c.form.currents.empty() ? 1 : 0.25);
    if (energy > most) most = energy, best = &c;
  }
  if (!best) {
    section.problem = fmt::format("nothing swings through zero within {:.4g} s from rest: no oscillation to take a period from", patience);
    return section;
  }
  section.form = best->form;
  section.words = best->name + " rises through zero";
  return section;
}

}  // namespace couplet
