// SPDX-License-Identifier: MIT
// What the recorder keeps of a march, against closed forms.
#include "engine/record/recorder.h"

#include <atomic>
#include <cstdlib>
#include <fstream>
#include <new>
#include <set>

#include "tests/agrees.h"
#include "tests/record/circuits.h"

using namespace couplet;
using namespace couplet::test;

// Counts what C++ asks for memory in this test program.
static std::atomic<long> allocations{0};
__attribute__((noinline)) void* operator new(std::size_t size) {
  ++allocations;
  if (void* p = std::malloc(size)) return p;
  throw std::bad_alloc();
}
__attribute__((noinline)) void* operator new(std::size_t size, std::align_val_t alignment) {
  ++allocations;
  const std::size_t unit = static_cast<std::size_t>(alignment);
  if (void* p = std::aligned_alloc(unit, (size + unit - 1) / unit * unit)) return p;
  throw std::bad_alloc();
}
__attribute__((noinline)) void operator delete(void* p) noexcept { std::free(p); }
__attribute__((noinline)) void operator delete(void* p, std::size_t) noexcept { std::free(p); }
__attribute__((noinline)) void operator delete(void* p, std::align_val_t) noexcept { std::free(p); }

namespace {

/// Hands on to a recorder, and counts what it allocates from a time on.
class Counting : public Observer {
 public:
  Counting(Recorder& recorder, double from) : recorder_(recorder), from_(from) {}
  void span(const Span& span) override {
    const long before = allocations;
    recorder_.span(span);
    if (span.start > from_) count_ += allocations - before, ++spans_;
  }
  void event(const Event& event) override {
    const long before = allocations;
    recorder_.event(event);
    if (event.time > from_) count_ += allocations - before;
  }
  long count() const { return count_; }
  long spans() const { return spans_; }

 private:
  Recorder& recorder_;
  double from_;
  long count_ = 0, spans_ = 0;
};

const Tolerance hermite{
    0, 1e-4, "a (w h)^4 / 384 of the cubic on a sine wave, with the recorder's bound on curvature, of 1"};

double resident_megabytes() {
  std::ifstream in("/proc/self/statm");
  double total = 0, resident = 0;
  in >> total >> resident;
  return resident * static_cast<double>(sysconf(_SC_PAGESIZE)) / 1e6;
}

/// Marches from rest and records.
MarchReport record(const Circuit& circuit, const std::string& path, const RecorderSettings& settings,
                   double until) {
  RecordWriter writer(path, small_design(), {}, "0");
  Recorder recorder(circuit, writer, settings);
  const auto march = exact_march(circuit, {});
  MarchState state = march->stand(circuit.start_state(), 0);
  const auto report = march->run(state, until, &recorder);
  recorder.finish();
  writer.report(report);
  writer.close();
  return report;
}

std::vector<std::size_t> begin_ends(const RecordReader& reader) {
  auto rows = reader.stretches();
  rows.push_back(reader.full_time().size());
  return rows;
}

}  // namespace

TEST_CASE("detail and periods of a driven coil follow the closed form") {
  // i(t) = A / |Z| (sin(w t - p) + sin(p) exp(-t R / L)), tan p = w L / R. One smooth span: the march takes
  // no step for the recorder's sake.
  constexpr double A = 10, f = 1e5, w = 2 * M_PI * f, L = 2e-6, R = 1.5;
  Sheet sheet;
  sine_source(sheet, "in", A, f);
  coil(sheet, "choke", "in", "gnd", L, R);
  const Circuit circuit(sheet);
  const Scratch file("coil.h5");
  RecorderSettings settings;
  settings.period = 1 / f;
  const auto report = record(circuit, file.path(), settings, 100 / f);
  CHECK(report.steps < 10);
  const RecordReader reader(file.path());
  const double Z = std::hypot(R, w * L), p = std::atan2(w * L, R);
  const auto current = [&](double t) {
    return A / Z * (std::sin(w * t - p) + std::sin(p) * std::exp(-t * R / L));
  };

  const auto time = reader.full_time();
  const auto volts = reader.full(reader.signal("voltage of in")),
             amperes = reader.full(reader.signal("current of choke"));
  REQUIRE(time.size() >= 64 * 40);
  const Tolerance exact{0, 1e-9, "round-off of a hundred periods' phase, of 10"};
  bool good = true;
  for (std::size_t r = 0; r < time.size(); ++r) {
    good = good && agrees(volts[r], A * std::sin(w * time[r]), exact) &&
           agrees(amperes[r], current(time[r]), exact);
  }
  CHECK(good);
  // The march is one piece here, kept in one stretch.
  double widest = 0;
  for (std::size_t r = 1; r < time.size(); ++r) widest = std::max(widest, time[r] - time[r - 1]);
  CHECK(widest <= 1 / f / 64 * (1 + 1e-9));

  const auto periods = reader.periods();
  REQUIRE(periods.start.size() == 100);
  const auto v = reader.period_values(reader.signal("voltage of in")),
             i = reader.period_values(reader.signal("current of choke"));
  for (std::size_t k = 0; k < 100; ++k) {
    CHECK(agrees(periods.start[k], static_cast<double>(k) / f, {1e-12, 1e-18, "round-off"}));
    CHECK(agrees(v.maximum[k] / A, 1, hermite));
    CHECK(agrees(v.minimum[k] / A, -1, hermite));
    CHECK(agrees(v.mean[k] / A, 0, hermite));
    // The mean of the transient alone, by its integral.
    const double decay =
        A / Z * std::sin(p) * (L / R * f) *
        (std::exp(-static_cast<double>(k) / f * R / L) - std::exp(-static_cast<double>(k + 1) / f * R / L));
    CHECK(agrees(i.mean[k] * Z / A, decay * Z / A, hermite));
  }
  CHECK(agrees(i.maximum[99] * Z / A, 1, hermite));
}

TEST_CASE("a spike of two nanoseconds is not lost") {
  // A step of 5 V into a series resonance of 2 ns: the capacitor overshoots by exp(-pi z / sqrt(1 - z^2)), z
  // = R/2 sqrt(C/L).
  constexpr double L = 10e-9, C = 10e-12, R = 19;
  Sheet sheet;
  const int part = sheet.part("source", "supply", sheet.node("in"), 0, Role::source);
  Waveform step;
  step.points = {{0, 0}, {45.1e-6, 0}, {45.1e-6, 5}};
  sheet.emf(part, sheet.node("in"), 0, Form().wave(sheet.waveform(step)));
  coil(sheet, "lead", "in", "gate", L, R);
  capacitor(sheet, "gate_charge", "gate", "gnd", C);
  const Circuit circuit(sheet);
  const Scratch file("spike.h5");
  RecorderSettings settings;
  settings.period = 10e-6;
  settings.start = 0;
  settings.last = 1;
  const auto report = record(circuit, file.path(), settings, 100e-6);
  CHECK(report.steps < 100);
  const RecordReader reader(file.path());
  const auto gate = reader.period_values(reader.signal("voltage of gate"));
  const auto lead = reader.period_values(reader.signal("current of lead"));
  REQUIRE(gate.maximum.size() == 10);
  const double z = R / 2 * std::sqrt(C / L), root = std::sqrt(1 - z * z), w = 1 / std::sqrt(L * C);
  CHECK(agrees(gate.maximum[4] / 5, 1 + std::exp(-M_PI * z / root),
               {0, 3e-4, "the cubic's bound, a few times for the damping"}));
  // The current's peak is at tan(w root t) = root / z: i = 5 / (w L) exp(-w z t).
  const double t = std::acos(z) / (w * root);
  CHECK(agrees(lead.maximum[4] * w * L / 5, std::exp(-w * z * t), {0, 3e-4, "the same"}));
  CHECK(gate.maximum[3] == 0);
  CHECK(agrees(gate.maximum[6], 5, {1e-6, 0, "single precision, settled"}));
}

TEST_CASE("periods by a probe, detail at start and end, events and regions in it") {
  const Circuit circuit(two_diodes());
  const Scratch file("probe.h5");
  RecorderSettings settings;
  settings.probe = 0;
  settings.period = 1.1e-5;
  record(circuit, file.path(), settings, 500.25e-5);
  const RecordReader reader(file.path());
  const auto periods = reader.periods();
  REQUIRE(periods.start.size() >= 500);
  for (std::size_t k = 2; k + 1 < periods.start.size(); ++k) {
    CHECK(agrees(periods.duration[k], 1e-5, {1e-9, 0, "round-off of the crossing"}));
  }
  const auto rows = begin_ends(reader);
  REQUIRE(rows.size() == 3);
  const auto time = reader.full_time();
  CHECK(time[rows[0]] == 0);
  CHECK(time[rows[1] - 1] > 18e-5);
  CHECK(time[rows[1] - 1] < 23e-5);
  CHECK(time[rows[1]] <= (500.25 - 20) * 1e-5);
  CHECK(time[rows[1]] >= (500.25 - 22) * 1e-5);
  CHECK(time.back() == 500.25e-5);
  for (std::size_t s = 0; s + 1 < rows.size(); ++s) {
    for (std::size_t r = rows[s] + 1; r < rows[s + 1]; ++r) {
      REQUIRE(time[r] >= time[r - 1]);
      REQUIRE(time[r] - time[r - 1] <= 1.1e-5 / 64 * (1 + 1e-9));
    }
  }
  // Every event has its points, and each change of a region an event of its diode at the same time.
  const auto events = reader.events();
  const auto regions = reader.regions();
  REQUIRE(events.time.size() > 100);
  const std::set<double> instants(time.begin(), time.end());
  std::set<std::pair<double, std::string>> seen;
  for (std::size_t e = 0; e < events.time.size(); ++e) {
    CHECK(instants.count(events.time[e]) == 1);
    if (events.kind[e] == 0)
      seen.insert({events.time[e], events.names[events.name[e]] + " " + events.states[events.state[e]]});
  }
  int changes = 0;
  for (std::size_t r = 0; r < regions.time.size(); ++r) {
    if (regions.time[r] == time[rows[0]] || regions.time[r] == time[rows[1]]) continue;
    ++changes;
    CHECK(seen.count({regions.time[r],
                      regions.branches[regions.branch[r]] + " " + regions.states[regions.state[r]]}) == 1);
  }
  CHECK(changes > 100);
  // Signals within the detail keep to the minima and maxima of their periods.
  for (int s = 0; s < static_cast<int>(reader.signals().size()); ++s) {
    const auto values = reader.full(s);
    const auto summary = reader.period_values(s);
    std::size_t k = 0;
    double largest = 0, beyond = 0;
    for (std::size_t r = 0; r < time.size(); ++r) {
      while (k + 1 < periods.start.size() && periods.start[k + 1] <= time[r]) ++k;
      if (time[r] == periods.start[k]) continue;  // belongs to either
      largest = std::max(largest, std::abs(values[r]));
      beyond = std::max({beyond, values[r] - summary.maximum[k], summary.minimum[k] - values[r]});
    }
    CHECK(agrees(beyond, 0, {0, 1e-4 * largest, "the cubic's bound"}));
  }
}

TEST_CASE("a scheduled change has detail on both sides") {
  const Circuit before(two_diodes());
  Sheet changed = two_diodes();
  changed.capacitors[1].capacitance *= 2;
  const Circuit after(changed);
  const Scratch file("change.h5");
  {
    RecordWriter writer(file.path(), small_design(), {}, "0");
    RecorderSettings settings;
    settings.probe = 0;
    settings.period = 1e-5;
    settings.start = 3, settings.around = 4, settings.last = 5;
    Recorder recorder(before, writer, settings);
    const auto first = exact_march(before, {}), second = exact_march(after, {});
    MarchState state = first->stand(before.start_state(), 0);
    recorder.mark(50.5e-5);
    first->run(state, 50.5e-5, &recorder);
    first->run(state, 100.5e-5, &recorder);
    const Eigen::VectorXd w = before.topology(state.cells).C * state.x;
    recorder.follow(after);
    state = second->stand(after.carry_over(before, w), state.time);
    second->run(state, 200e-5, &recorder);
    recorder.finish();
    writer.close();
  }
  const RecordReader reader(file.path());
  const auto rows = begin_ends(reader);
  REQUIRE(rows.size() == 5);
  const auto time = reader.full_time();
  const double from[] = {0, 46e-5, 96e-5, 195e-5}, to[] = {3e-5, 54e-5, 104e-5, 200e-5};
  for (int s = 0; s < 4; ++s) {
    CHECK(agrees(time[rows[s]], from[s], {0, 1.01e-5, "a period"}));
    CHECK(agrees(time[rows[s + 1] - 1], to[s], {0, 1.01e-5, "a period"}));
  }
}

TEST_CASE("all keeps everything") {
  const Circuit circuit(two_diodes());
  const Scratch file("all.h5");
  RecorderSettings settings;
  settings.probe = 0;
  settings.period = 1e-5;
  settings.all = true;
  settings.signals = {"voltage of plus", "current of choke"};
  record(circuit, file.path(), settings, 300e-5);
  const RecordReader reader(file.path());
  CHECK(reader.signals().size() == 2);
  CHECK(reader.stretches().size() == 1);
  CHECK(reader.full_time().size() >= 300 * 64);
  CHECK(reader.full_time().back() == 300e-5);
  settings.signals = {"voltage of pluss"};
  CHECK_THROWS_WITH(
      choose_outputs(circuit, settings.signals),
      Catch::Contains("there is no signal \"voltage of pluss\"; give one of \"voltage of in\""));
}

TEST_CASE("a probe that stays silent neither fills memory nor the file") {
  Sheet sheet = two_diodes();
  sheet.probes[0].form = Form().add(1);
  const Circuit circuit(sheet);
  const Scratch file("silent.h5");
  RecorderSettings settings;
  settings.probe = 0;
  settings.period = 1e-5;
  record(circuit, file.path(), settings, 1e-2);
  const RecordReader reader(file.path());
  CHECK(reader.periods().start.size() == 125);
  CHECK(reader.periods().start.back() == Approx(124 * 8e-5));
}

TEST_CASE("a hundred thousand periods stay small") {
  const Circuit circuit(two_diodes());
  const Scratch file("long.h5");
  RecorderSettings settings;
  settings.probe = 0;
  settings.period = 1e-5;
  const double before = resident_megabytes();
  record(circuit, file.path(), settings, 1);
  CHECK(resident_megabytes() - before < 100);
  CHECK(static_cast<double>(std::filesystem::file_size(file.path())) < 60e6);
  const RecordReader reader(file.path());
  CHECK(reader.periods().start.size() >= 100000);
}

TEST_CASE("a recorder that runs allocates nothing") {
  const Circuit circuit(two_diodes());
  const Scratch file("still.h5");
  RecordWriter writer(file.path(), small_design(), {}, "0");
  RecorderSettings settings;
  settings.probe = 0;
  settings.period = 1e-5;
  Recorder recorder(circuit, writer, settings);
  Counting counting(recorder, 100e-5);
  const auto march = exact_march(circuit, {});
  MarchState state = march->stand(circuit.start_state(), 0);
  march->run(state, 3000e-5, &counting);
  CHECK(counting.spans() > 100000);
  CHECK(counting.count() == 0);
  recorder.finish();
  writer.close();
}
