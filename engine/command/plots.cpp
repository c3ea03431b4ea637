// SPDX-License-Identifier: MIT
#include "engine/command/plots.h"

#include <fmt/format.h>

#include <cmath>

#include "engine/page/drawing.h"

namespace couplet {
namespace {

/// Samples every span of a lap: enough points to draw from, on the exact interpolant.
class Sampler : public Observer {
 public:
  Sampler(const Quantities& quantities, std::vector<int> wanted, double begin, double step) : quantities_(quantities), wanted_(std::move(wanted)), begin_(begin), step_(step), y(wanted_.size()) {}
  void span(const Span& span) override {
    const Eigen::MatrixXd rows = quantities_.rows(*span.topology);
    const int pieces = std::max(1, static_cast<int>(span.duration / step_));
    Eigen::VectorXd state(rows.cols());
    for (int k = 0; k <= pieces; ++k) {
      if (k == 0) {
        state = Eigen::Map<const Eigen::VectorXd>(span.x0, rows.cols());
      } else if (k == pieces) {
        state = Eigen::Map<const Eigen::VectorXd>(span.x1, rows.cols());
      } else {
        span.between->at(span.duration * k / pieces, state.data());
      }
      t.push_back(span.start + span.duration * k / pieces - begin_);
      for (std::size_t i = 0; i < wanted_.size(); ++i) y[i].push_back(rows.row(wanted_[i]).dot(state));
    }
  }

 private:
  const Quantities& quantities_;
  std::vector<int> wanted_;
  double begin_, step_;

 public:
  std::vector<double> t;
  std::vector<std::vector<double>> y;
};

}  // namespace

std::string plot_start(const RecordReader& record, const Design& design) {
  const auto periods = record.periods();
  std::vector<Panel> panels;
  const auto band = [&](const std::string& name, const std::string& title) {
    const int signal = record.signal(name);
    if (signal < 0) return;
    const auto values = record.period_values(signal);
    Panel panel{title, record.signals()[signal].unit, {}, {}};
    panel.lines.push_back({"smallest to largest in each period", periods.start, values.minimum, values.maximum, false});
    panels.push_back(panel);
  };
  band("voltage of " + design.rail, "Rail (" + design.rail + ")");
  // The two coils of the first coupling carry the link; show their currents.
  if (!design.couplings.empty()) {
    for (const auto& coil : design.couplings.front().coils) band("current of " + coil, "Current of " + coil);
  }
  return draw(design.title + ": start", "time from switching on", "s", panels);
}

std::string plot_settle(const SteadyState& state, const Design& design) {
  Bench& bench = *state.bench;
  std::vector<int> wanted;
  std::vector<std::string> names;
  const auto want = [&](const std::string& name) {
    if (const int i = bench.quantities.index(name); i >= 0) wanted.push_back(i), names.push_back(name);
  };
  std::vector<std::size_t> ends;
  want("rail");
  ends.push_back(wanted.size());
  for (const auto& p : bench.circuit.sheet().parts) {
    if (p.kind == "fet" || p.kind == "switch") want(p.name + ".voltage");
  }
  ends.push_back(wanted.size());
  if (!design.couplings.empty()) {
    for (const auto& coil : design.couplings.front().coils) want(coil + ".current");
  }
  ends.push_back(wanted.size());
  Sampler sampler(bench.quantities, wanted, bench.lapper.base(), state.orbit.period / 400);
  bench.lapper.lap(state.orbit.start, state.orbit.period / state.orbit.returns, state.orbit.returns, false, &sampler);
  std::vector<Panel> panels;
  const char* titles[] = {"Rail", "Voltage across the switches", "Coil currents"};
  const char* units[] = {"V", "V", "A"};
  std::size_t from = 0;
  for (int k = 0; k < 3; ++k) {
    Panel panel{titles[k], units[k], {}, {}};
    for (std::size_t i = from; i < ends[k]; ++i) panel.lines.push_back({names[i], sampler.t, sampler.y[i], {}, false});
    from = ends[k];
    if (!panel.lines.empty()) panels.push_back(panel);
  }
  return draw(design.title + ": one settled period", "time within the period", "s", panels);
}

std::string plot_path(const Path& path, const Design& design) {
  std::vector<Panel> panels;
  const auto add = [&](const char* figure, const char* title, const char* unit) {
    if (path.points.empty() || !path.points.front().figures.find(figure)) return;
    Panel panel{title, unit, {}, {}};
    // Consecutive points of one stability make one line.
    for (std::size_t i = 0; i < path.points.size();) {
      DrawnLine line;
      line.faint = !path.points[i].stable;
      line.label = panel.lines.empty() ? (line.faint ? "unstable" : "stable") : "";
      const std::size_t begin = i;
      while (i < path.points.size() && path.points[i].stable != line.faint) {
        line.x.push_back(path.points[i].value);
        line.y.push_back(path.points[i].figures.value(figure));
        ++i;
      }
      if (i < path.points.size()) line.x.push_back(path.points[i].value), line.y.push_back(path.points[i].figures.value(figure));
      if (i == begin) break;
      panel.lines.push_back(line);
    }
    if (std::string(figure) == "frequency") {
      for (const auto& m : path.marks) panel.marks.push_back({m.value, m.frequency, m.words.substr(0, m.words.find(':'))});
    }
    panels.push_back(panel);
  };
  add("frequency", "Operating frequency", "Hz");
  add("rail.mean", "Rail, mean", "V");
  add("regulator.headroom", "Regulator headroom, smallest over the period", "V");
  add("efficiency", "Efficiency, supply to load", "1");
  return draw(design.title + ": along " + path.along, path.along, path.unit, panels, true);
}

}  // namespace couplet
