// SPDX-License-Identifier: MIT
#include "engine/march/exact.h"

namespace couplet {

void Moments::clear() {
  for (auto& t : topologies_) {
    for (auto& rung : t.rung_squares) std::fill(rung.begin(), rung.end(), 0.0);
    std::fill(t.rest.begin(), t.rest.end(), 0.0);
  }
}

std::vector<Eigen::MatrixXd> Moments::integrals(const std::vector<std::unique_ptr<Flow>>& flows) const {
  std::vector<Eigen::MatrixXd> all(topologies_.size());
  for (std::size_t id = 0; id < topologies_.size(); ++id) {
    const PerTopology& t = topologies_[id];
    if (id >= flows.size() || !flows[id] || (t.rung_squares.empty() && t.rest.empty())) continue;
    const int n = flows[id]->size(), stride = flows[id]->stride();
    all[id] = flows[id]->integrate_squares(t.rung_squares);
    if (t.rest.empty()) continue;
    for (int c = 0; c < n; ++c) {
      for (int r = 0; r < n; ++r) all[id](r, c) += t.rest[static_cast<long>(c) * stride + r];
    }
  }
  return all;
}

}  // namespace couplet
