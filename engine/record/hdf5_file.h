// SPDX-License-Identifier: MIT
// An HDF5 file, written so that a killed program leaves it readable up to the last flush, and read back.
//
// How that is reached: the file keeps the plain (earliest) format, which carries no "open for writing" mark;
// metadata reaches the disk at a flush only; a chunk is written once, whole, and never moved, so that nothing
// that an earlier flush points to is ever overwritten. A kill inside a flush itself (a millisecond in each
// second) is not guarded against. No times are stored and places in the file do not depend on flushes: the
// same data give the same bytes.
//
// This is the only file that sees HDF5's C interface. Paths use '/' between groups; parents are made as
// needed.
#pragma once

#include <chrono>
#include <cstdint>
#include <stdexcept>
#include <string>
#include <vector>

namespace couplet {

/// A record that cannot be written or read; the text names the file and says what to do.
class RecordError : public std::runtime_error {
 public:
  explicit RecordError(const std::string& text) : std::runtime_error(text) {}
};

class Hdf5File {
 public:
  /// Makes a file; an existing one is kept (RecordError) unless `replace`.
  static Hdf5File create(const std::string& path, bool replace);
  static Hdf5File open(const std::string& path);
  Hdf5File(Hdf5File&& other) noexcept;
  Hdf5File(const Hdf5File&) = delete;
  Hdf5File& operator=(const Hdf5File&) = delete;
  ~Hdf5File();

  const std::string& path() const { return path_; }
  bool has(const std::string& name) const;

  // Whole datasets and attributes. Texts are UTF-8 of fixed length.
  void group(const std::string& name);
  void numbers(const std::string& name, const std::vector<double>& values, const std::string& unit,
               const std::string& label);
  void texts(const std::string& name, const std::vector<std::string>& values, const std::string& label);
  void text(const std::string& name, const std::string& value, const std::string& label);
  void attribute(const std::string& object, const std::string& name, const std::string& value);
  void attribute(const std::string& object, const std::string& name, double value);
  /// Marks `scale` as the axis of `dataset`.
  void axis(const std::string& dataset, const std::string& scale);
  void make_scale(const std::string& dataset, const std::string& name);

  std::size_t rows(const std::string& name) const;
  std::vector<double> numbers(const std::string& name) const;  // of any numeric type
  std::vector<std::string> texts(const std::string& name) const;
  std::string text(const std::string& name) const;
  double number_attribute(const std::string& object, const std::string& name) const;
  std::vector<std::string> members(const std::string& group) const;  // in order of name

  void flush();
  /// Where a second has passed since the last flush, or what set_flush_interval says.
  void flush_if_due();
  void set_flush_interval(std::chrono::milliseconds interval) { flush_interval_ = interval; }
  void close();

 private:
  template <class T>
  friend class Column;
  Hdf5File(std::string path, std::int64_t id);
  enum class Number { real, single, index };
  std::int64_t create_column(const std::string& name, Number type, int chunk, const std::string& unit,
                             const std::string& label);
  void write_rows(std::int64_t dataset, Number type, std::uint64_t at, std::uint64_t count, const void* data);
  static void close_column(std::int64_t dataset);
  [[noreturn]] void fail(const std::string& what, const std::string& remedy) const;

  std::string path_;
  std::int64_t id_ = -1;
  std::chrono::steady_clock::time_point flushed_;
  std::chrono::milliseconds flush_interval_{1000};
};

/// A one-dimensional compressed dataset that grows. T: double, float (stored as such) or std::int32_t.
/// Rows are held in memory until a chunk is whole.
template <class T>
class Column {
 public:
  Column(Hdf5File& file, const std::string& name, int chunk, const std::string& unit,
         const std::string& label);
  Column(Column&& other) noexcept;
  Column(const Column&) = delete;
  Column& operator=(const Column&) = delete;
  ~Column();
  void append(T value) {
    held_[count_++] = value;
    if (count_ == static_cast<int>(held_.size())) write_held();
  }
  std::uint64_t rows() const { return written_ + static_cast<std::uint64_t>(count_); }
  /// Writes what is held although the chunk is not whole; nothing may be appended after it.
  void end() {
    if (count_ > 0) write_held();
  }

 private:
  void write_held();
  Hdf5File* file_;
  std::int64_t id_;
  std::vector<T> held_;
  int count_ = 0;
  std::uint64_t written_ = 0;
};

}  // namespace couplet
