// SPDX-License-Identifier: MIT
// The file: what is written comes back, also after a kill, also through another reader.
#include "engine/record/record.h"

#include <sys/wait.h>

#include <csignal>
#include <cstdlib>
#include <fstream>

#include "tests/agrees.h"
#include "tests/record/circuits.h"

using namespace couplet;
using namespace couplet::test;

namespace {

const std::vector<Signal> two_signals = {{"voltage of in/out", "V"}, {"current of choke", "A"}};

/// What row r of the written columns holds; exact in single precision too.
double value_of(int row, int signal) { return 0.25 * (row % 4096) + signal; }

void write_rows(RecordWriter& writer, int from, int to) {
  for (int row = from; row < to; ++row) {
    const double values[] = {value_of(row, 0), value_of(row, 1)};
    const double lower[] = {values[0] - 1, values[1] - 1}, upper[] = {values[0] + 1, values[1] + 1};
    writer.full(row, values);
    writer.period(row, 1, lower, upper, values);
  }
}

bool rows_hold(const RecordReader& reader) {
  const auto time = reader.full_time();
  const auto periods = reader.periods();
  for (int s = 0; s < 2; ++s) {
    const auto values = reader.full(s);
    const auto summary = reader.period_values(s);
    if (values.size() != time.size() || summary.mean.size() != periods.start.size()) return false;
    for (std::size_t r = 0; r < time.size(); ++r) {
      if (time[r] != static_cast<double>(r) || values[r] != value_of(static_cast<int>(r), s)) return false;
    }
    for (std::size_t r = 0; r < periods.start.size(); ++r) {
      const double mean = value_of(static_cast<int>(r), s);
      if (summary.mean[r] != mean || summary.minimum[r] != mean - 1 || summary.maximum[r] != mean + 1)
        return false;
    }
  }
  return true;
}

std::string output_of(const std::string& command) {
  std::string text;
  FILE* pipe = popen((command + " 2>&1").c_str(), "r");
  if (!pipe) return text;
  for (int c = fgetc(pipe); c != EOF; c = fgetc(pipe)) text += static_cast<char>(c);
  return pclose(pipe) == 0 ? text : "FAILED: " + text;
}

void write_whole(const std::string& path, bool often = false) {
  RecordWriter writer(path, small_design(), {"couplet", "start", "bench.toml"}, "0.1.0");
  if (often) writer.file().set_flush_interval(std::chrono::milliseconds(0));
  writer.begin(two_diodes(), two_signals);
  writer.new_stretch();
  write_rows(writer, 0, 3000);
  writer.new_stretch();
  write_rows(writer, 3000, 5000);
  writer.event(1.5, Event::Kind::region, 3, writer.state_index("conducts"));
  writer.event(2.5, Event::Kind::corner, -1, -1);
  writer.region(1.5, 2, writer.state_index("conducts"));
  Figures figures;
  figures.set("rail.max", 12.5, "V", 3e-3);
  figures.set("frequency", 1e5, "Hz");
  writer.figures(figures);
  Verdict verdict;
  verdict.name = "headroom", verdict.figure = "regulator.headroom", verdict.unit = "V", verdict.value = 0.5,
  verdict.at_least = 0.25;
  verdict.status = Verdict::Status::not_met, verdict.margin = 0.25, verdict.margin_percent = 100,
  verdict.why = "dropout";
  writer.verdicts({verdict});
  MarchReport report;
  report.sentence = "reached 1 s";
  report.steps = 17;
  writer.report(report);
  writer.close();
}

}  // namespace

TEST_CASE("a record gives back what was written") {
  const Scratch file("whole.h5");
  write_whole(file.path());
  const RecordReader reader(file.path());
  CHECK(reader.finished());
  CHECK(reader.netlist().text == small_design().text);
  CHECK(reader.netlist().sha256 == "0123");
  CHECK(reader.netlist().file == "bench.toml");
  const auto program = reader.program();
  CHECK(program.sentence == "reached 1 s");
  CHECK(program.options == std::vector<std::string>{"couplet", "start", "bench.toml"});
  CHECK(program.steps == 17);
  REQUIRE(reader.signals().size() == 2);
  CHECK(reader.signals()[0].name == "voltage of in/out");
  CHECK(reader.signal("current of choke") == 1);
  CHECK(reader.full_time().size() == 5000);
  CHECK(reader.periods().start.size() == 5000);
  CHECK(rows_hold(reader));
  CHECK(reader.stretches() == std::vector<std::size_t>{0, 3000});
  const auto events = reader.events();
  REQUIRE(events.time.size() == 2);
  CHECK(events.names[events.name[0]] == "stray");
  CHECK(events.states[events.state[0]] == "conducts");
  CHECK(events.kinds[events.kind[1]] == "corner");
  const auto regions = reader.regions();
  REQUIRE(regions.time.size() == 1);
  CHECK(regions.branches[regions.branch[0]] == two_diodes().branches[2].name);
  CHECK(*reader.figures().find("rail.max")->when == 3e-3);
  CHECK_FALSE(reader.figures().find("frequency")->when);
  const auto verdicts = reader.verdicts();
  REQUIRE(verdicts.size() == 1);
  CHECK(verdicts[0].status == Verdict::Status::not_met);
  CHECK(*verdicts[0].at_least == 0.25);
  CHECK_FALSE(verdicts[0].at_most);
}

TEST_CASE("the same data give the same bytes, however often they are flushed") {
  const Scratch first("first.h5"), second("second.h5");
  write_whole(first.path());
  sleep(1);  // stored times would differ
  write_whole(second.path(), true);
  const auto bytes = [](const std::string& path) {
    std::ifstream in(path, std::ios::binary);
    return std::string(std::istreambuf_iterator<char>(in), {});
  };
  CHECK(bytes(first.path()) == bytes(second.path()));
}

TEST_CASE("complaints about files say what to do") {
  const Scratch file("kept.h5");
  std::ofstream(file.path()) << "not a record";
  const auto complaint = [](auto&& act) {
    try {
      act();
    } catch (const RecordError& error) {
      return std::string(error.what());
    }
    return std::string("no complaint");
  };
  CHECK(complaint([&] { RecordWriter(file.path(), small_design(), {}, "0"); }) ==
        file.path() + ": exists already; give another --out, or --force to replace it");
  CHECK(complaint([&] { RecordReader reader(file.path()); }) ==
        file.path() + ": is not an HDF5 file; give a record that couplet has written");
  CHECK(complaint([&] { RecordReader reader(file.path() + "x"); }) ==
        file.path() + "x: there is no such file; check the name");
  CHECK(complaint([&] { RecordWriter("/no/such/folder/a.h5", small_design(), {}, "0"); }) ==
        "/no/such/folder/a.h5: the folder /no/such/folder is not there; make it, or give another --out");
  { RecordWriter replaced(file.path(), small_design(), {}, "0", true); }
  CHECK_FALSE(RecordReader(file.path()).finished());
  Hdf5File::create(file.path(), true).text("/other", "x", "something else");
  CHECK(complaint([&] { RecordReader reader(file.path()); }) ==
        file.path() + ": is no record of couplet; give the file that a run has written");
}

TEST_CASE("a killed run leaves a readable file up to the last flush") {
  // The child flushes, writes on without a flush, says so, and is killed while it writes.
  for (int round = 0; round < 20; ++round) {
    const Scratch file("killed.h5");
    const int flushed = 4096 * (1 + round % 5);
    int ends[2];
    REQUIRE(pipe(ends) == 0);
    const pid_t child = fork();
    REQUIRE(child >= 0);
    if (child == 0) {
      RecordWriter writer(file.path(), small_design(), {}, "0.1.0");
      writer.begin(two_diodes(), two_signals);
      writer.file().set_flush_interval(std::chrono::hours(1));
      writer.new_stretch();
      write_rows(writer, 0, flushed);
      writer.file().flush();
      if (write(ends[1], "x", 1) != 1) _exit(1);
      for (int row = flushed;; row += 1000) write_rows(writer, row, row + 1000);
    }
    char said = 0;
    REQUIRE(read(ends[0], &said, 1) == 1);
    usleep(1000 + 3001 * round);
    kill(child, SIGKILL);
    int status = 0;
    waitpid(child, &status, 0);
    close(ends[0]), close(ends[1]);
    REQUIRE(WIFSIGNALED(status));
    const RecordReader reader(file.path());
    CHECK_FALSE(reader.finished());
    CHECK(reader.full_time().size() == static_cast<std::size_t>(flushed));
    CHECK(reader.periods().start.size() == static_cast<std::size_t>(flushed));
    CHECK(rows_hold(reader));
  }
}

TEST_CASE("other readers of HDF5 read a record") {
  const Scratch file("others.h5");
  write_whole(file.path());
  SECTION("h5dump") {
    if (std::system("command -v h5dump >/dev/null 2>&1") != 0) {
      WARN("skipped: h5dump is not installed (package hdf5-tools)");
      return;
    }
    const std::string text = output_of("h5dump -A -d '/periods/mean/current of choke' " + file.path());
    CHECK(text.find("FAILED") == std::string::npos);
    CHECK(text.find("\"unit\"") != std::string::npos);
    CHECK(text.find("( 5000 )") != std::string::npos);
  }
  SECTION("h5py") {
    if (std::system("/usr/bin/python3 -c 'import h5py' >/dev/null 2>&1") != 0) {
      WARN("skipped: h5py is not installed (package python3-h5py)");
      return;
    }
    const std::string text =
        output_of("/usr/bin/python3 -c \"import h5py; f = h5py.File('" + file.path() +
                  "'); d = f['full/current of choke']; print(d.attrs['unit'], d.dims[0][0].name, d[4095], "
                  "d.dims[0][0][4095], f['netlist/title'][()].decode(), d.compression)\"");
    CHECK(text == "A /full/time 1024.75 4095.0 Bench gzip\n");
  }
}
