// SPDX-License-Identifier: MIT
// The ledger must close for a sound circuit and must not for one whose law is not the one that was marched.
#include "engine/figures/energy.h"
#include "engine/march/exact.h"
#include "tests/agrees.h"

namespace couplet {
namespace {

/// 10 V through 2 ohm onto 3 uF; `leak` ohms across the capacitor.
Sheet charger(double leak) {
  Sheet sheet;
  const Node in = sheet.node("in"), out = sheet.node("out");
  sheet.emf(sheet.part("supply", "supply", in, 0, Role::source), in, 0, Form().add(10));
  sheet.resistor(sheet.part("series", "resistor", in, out), in, out, 2);
  sheet.capacitor(sheet.part("store", "capacitor", out, 0), out, 0, 3e-6, 0);
  sheet.resistor(sheet.part("leak", "resistor", out, 0), out, 0, leak);
  return sheet;
}

/// Marches `marched` for 20 us and keeps its books by the laws of `booked`.
EnergyAccount books(const Sheet& marched, const Sheet& booked) {
  const Circuit circuit(marched), laws(booked);
  MarchSettings settings;
  settings.keep_moments = true;
  ExactMarch march(circuit, settings);
  MarchState state = march.stand(circuit.start_state(), 0);
  const auto outputs = [&] { return Eigen::VectorXd(circuit.topology(state.cells).C * state.x); };
  const double before = stored_energy(circuit, outputs());
  laws.topology(state.cells);
  REQUIRE(march.run(state, 20e-6, nullptr).usable());
  return account(laws, march.moment_integrals(), before, stored_energy(circuit, outputs()));
}

}  // namespace

TEST_CASE("the ledger closes for a sound circuit") {
  const EnergyAccount account = books(charger(50), charger(50));
  CHECK(account.supplied > 1e-4);
  CHECK(account.relative() < 1e-12);  // sums of a few hundred roundings of 2^-53
}

TEST_CASE("an element that leaks without being in the books trips the ledger") {
  // The marched circuit loses a share of its charge that the booked one (1 Mohm) does not know of.
  const EnergyAccount account = books(charger(50), charger(1e6));
  CHECK(account.relative() > 1e-3);
}

}  // namespace couplet
