// SPDX-License-Identifier: MIT
#include "engine/record/hdf5_file.h"

#include <fmt/format.h>
#include <hdf5.h>
#include <hdf5_hl.h>

#include <algorithm>
#include <cstring>
#include <filesystem>
#include <utility>

namespace couplet {
namespace {

constexpr unsigned compression = 1;  // gzip level: higher ones cost several times the time for a few per cent

/// Closes an id at the end of its scope.
class Id {
 public:
  Id(hid_t id, herr_t (*close)(hid_t)) : id_(id), close_(close) {}
  Id(Id&& other) noexcept : id_(other.release()), close_(other.close_) {}
  Id(const Id&) = delete;
  Id& operator=(const Id&) = delete;
  ~Id() {
    if (id_ >= 0) close_(id_);
  }
  operator hid_t() const { return id_; }
  bool good() const { return id_ >= 0; }
  hid_t release() { return std::exchange(id_, -1); }

 private:
  hid_t id_;
  herr_t (*close_)(hid_t);
};

/// HDF5 prints its own stack of errors unless told not to; ours says what to do.
void silence() {
  static const bool once = [] { return H5Eset_auto2(H5E_DEFAULT, nullptr, nullptr) >= 0; }();
  static_cast<void>(once);
}

Id parents() {
  Id list(H5Pcreate(H5P_LINK_CREATE), H5Pclose);
  H5Pset_create_intermediate_group(list, 1);
  return list;
}

Id dataset_settings() {
  Id list(H5Pcreate(H5P_DATASET_CREATE), H5Pclose);
  H5Pset_obj_track_times(list, false);
  return list;
}

Id text_type(std::size_t length) {
  Id type(H5Tcopy(H5T_C_S1), H5Tclose);
  H5Tset_size(type, std::max<std::size_t>(length, 1));
  if (length != H5T_VARIABLE) H5Tset_strpad(type, H5T_STR_NULLPAD);
  H5Tset_cset(type, H5T_CSET_UTF8);
  return type;
}

std::string trimmed(const char* data, std::size_t length) { return {data, strnlen(data, length)}; }

}  // namespace

Hdf5File::Hdf5File(std::string path, std::int64_t id)
    : path_(std::move(path)), id_(id), flushed_(std::chrono::steady_clock::now()) {}
Hdf5File::Hdf5File(Hdf5File&& other) noexcept
    : path_(std::move(other.path_)), id_(std::exchange(other.id_, -1)), flushed_(other.flushed_) {}

Hdf5File::~Hdf5File() {
  if (id_ >= 0) H5Fclose(id_);
}

void Hdf5File::fail(const std::string& what, const std::string& remedy) const {
  throw RecordError(fmt::format("{}: {}; {}", path_, what, remedy));
}

Hdf5File Hdf5File::create(const std::string& path, bool replace) {
  silence();
  Hdf5File file(path, -1);
  std::error_code ignored;
  if (!replace && std::filesystem::exists(path, ignored))
    file.fail("exists already", "give another --out, or --force to replace it");
  const auto folder = std::filesystem::path(path).parent_path();
  if (!folder.empty() && !std::filesystem::is_directory(folder, ignored)) {
    file.fail("the folder " + folder.string() + " is not there", "make it, or give another --out");
  }
  const Id access(H5Pcreate(H5P_FILE_ACCESS), H5Pclose);
  // Metadata leaves memory at a flush only (see the header).
  H5AC_cache_config_t cache;
  cache.version = H5AC__CURR_CACHE_CONFIG_VERSION;
  // Without blocks set aside for small pieces, places in the file do not depend on when it is flushed.
  H5Pset_meta_block_size(access, 0);
  H5Pset_small_data_block_size(access, 0);
  H5Pget_mdc_config(access, &cache);
  cache.incr_mode = H5C_incr__off;
  cache.flash_incr_mode = H5C_flash_incr__off;
  cache.decr_mode = H5C_decr__off;
  cache.evictions_enabled = false;
  if (H5Pset_mdc_config(access, &cache) < 0)
    file.fail("HDF5 takes no cache settings", "this is a fault of the program");
  file.id_ = H5Fcreate(path.c_str(), H5F_ACC_TRUNC, H5P_DEFAULT, access);
  if (file.id_ < 0)
    file.fail("cannot be written", "check the folder's permissions and that no other program has it open");
  return file;
}

Hdf5File Hdf5File::open(const std::string& path) {
  silence();
  Hdf5File file(path, -1);
  std::error_code ignored;
  if (!std::filesystem::exists(path, ignored)) file.fail("there is no such file", "check the name");
  if (H5Fis_hdf5(path.c_str()) <= 0)
    file.fail("is not an HDF5 file", "give a record that couplet has written");
  file.id_ = H5Fopen(path.c_str(), H5F_ACC_RDONLY, H5P_DEFAULT);
  if (file.id_ < 0) file.fail("cannot be opened", "it is damaged, or another program is writing it");
  return file;
}

bool Hdf5File::has(const std::string& name) const {
  for (std::size_t at = name.find('/', 1);; at = name.find('/', at + 1)) {
    if (H5Lexists(id_, name.substr(0, at).c_str(), H5P_DEFAULT) <= 0) return false;
    if (at == std::string::npos) return true;
  }
}

void Hdf5File::group(const std::string& name) {
  const Id made(H5Gcreate2(id_, name.c_str(), parents(), H5P_DEFAULT, H5P_DEFAULT), H5Gclose);
  if (!made.good()) fail("cannot take the group " + name, "check that the disk is not full");
}

void Hdf5File::numbers(const std::string& name, const std::vector<double>& values, const std::string& unit,
                       const std::string& label) {
  const hsize_t count = values.size();
  const Id space(H5Screate_simple(1, &count, nullptr), H5Sclose);
  {
    const Id made(
        H5Dcreate2(id_, name.c_str(), H5T_IEEE_F64LE, space, parents(), dataset_settings(), H5P_DEFAULT),
        H5Dclose);
    if (!made.good() ||
        (count > 0 && H5Dwrite(made, H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT, values.data()) < 0)) {
      fail("cannot take " + name, "check that the disk is not full");
    }
  }
  if (!unit.empty()) attribute(name, "unit", unit);
  attribute(name, "label", label);
}

void Hdf5File::texts(const std::string& name, const std::vector<std::string>& values,
                     const std::string& label) {
  std::size_t length = 1;
  for (const auto& v : values) length = std::max(length, v.size());
  std::string packed(length * values.size(), '\0');
  for (std::size_t i = 0; i < values.size(); ++i)
    std::copy(values[i].begin(), values[i].end(), packed.begin() + i * length);
  const hsize_t count = values.size();
  const Id space(H5Screate_simple(1, &count, nullptr), H5Sclose), type = text_type(length);
  {
    const Id made(H5Dcreate2(id_, name.c_str(), type, space, parents(), dataset_settings(), H5P_DEFAULT),
                  H5Dclose);
    if (!made.good() ||
        (count > 0 && H5Dwrite(made, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, packed.data()) < 0)) {
      fail("cannot take " + name, "check that the disk is not full");
    }
  }
  attribute(name, "label", label);
}

void Hdf5File::text(const std::string& name, const std::string& value, const std::string& label) {
  const Id space(H5Screate(H5S_SCALAR), H5Sclose), type = text_type(value.size());
  std::string padded = value;
  padded.resize(std::max<std::size_t>(value.size(), 1));
  {
    const Id made(H5Dcreate2(id_, name.c_str(), type, space, parents(), dataset_settings(), H5P_DEFAULT),
                  H5Dclose);
    if (!made.good() || H5Dwrite(made, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, padded.data()) < 0) {
      fail("cannot take " + name, "check that the disk is not full");
    }
  }
  attribute(name, "label", label);
}

void Hdf5File::attribute(const std::string& object, const std::string& name, const std::string& value) {
  // Of variable length: the form in which readers hand attributes out as text.
  const Id on(H5Oopen(id_, object.c_str(), H5P_DEFAULT), H5Oclose), space(H5Screate(H5S_SCALAR), H5Sclose),
      type = text_type(H5T_VARIABLE);
  const Id made(H5Acreate2(on, name.c_str(), type, space, H5P_DEFAULT, H5P_DEFAULT), H5Aclose);
  const char* data = value.c_str();
  if (!made.good() || H5Awrite(made, type, &data) < 0)
    fail("cannot take " + name + " of " + object, "check that the disk is not full");
}

void Hdf5File::attribute(const std::string& object, const std::string& name, double value) {
  const Id on(H5Oopen(id_, object.c_str(), H5P_DEFAULT), H5Oclose), space(H5Screate(H5S_SCALAR), H5Sclose);
  const Id made(H5Acreate2(on, name.c_str(), H5T_IEEE_F64LE, space, H5P_DEFAULT, H5P_DEFAULT), H5Aclose);
  if (!made.good() || H5Awrite(made, H5T_NATIVE_DOUBLE, &value) < 0)
    fail("cannot take " + name + " of " + object, "check that the disk is not full");
}

void Hdf5File::make_scale(const std::string& dataset, const std::string& name) {
  const Id set(H5Dopen2(id_, dataset.c_str(), H5P_DEFAULT), H5Dclose);
  if (H5DSset_scale(set, name.c_str()) < 0)
    fail("cannot make an axis of " + dataset, "check that the disk is not full");
}

void Hdf5File::axis(const std::string& dataset, const std::string& scale) {
  const Id set(H5Dopen2(id_, dataset.c_str(), H5P_DEFAULT), H5Dclose),
      along(H5Dopen2(id_, scale.c_str(), H5P_DEFAULT), H5Dclose);
  if (H5DSattach_scale(set, along, 0) < 0)
    fail("cannot give " + dataset + " its axis", "check that the disk is not full");
}

std::size_t Hdf5File::rows(const std::string& name) const {
  const Id set(has(name) ? H5Dopen2(id_, name.c_str(), H5P_DEFAULT) : -1, H5Dclose);
  if (!set.good()) fail("has no " + name, "give a record that couplet has written");
  const Id space(H5Dget_space(set), H5Sclose);
  return static_cast<std::size_t>(std::max<hssize_t>(H5Sget_simple_extent_npoints(space), 0));
}

std::vector<double> Hdf5File::numbers(const std::string& name) const {
  const Id set(has(name) ? H5Dopen2(id_, name.c_str(), H5P_DEFAULT) : -1, H5Dclose);
  if (!set.good()) fail("has no " + name, "give a record that couplet has written");
  const Id space(H5Dget_space(set), H5Sclose);
  std::vector<double> values(std::max<hssize_t>(H5Sget_simple_extent_npoints(space), 0));
  if (!values.empty() && H5Dread(set, H5T_NATIVE_DOUBLE, H5S_ALL, H5S_ALL, H5P_DEFAULT, values.data()) < 0) {
    fail("cannot read " + name, "the file is damaged: march again");
  }
  return values;
}

std::vector<std::string> Hdf5File::texts(const std::string& name) const {
  const Id set(has(name) ? H5Dopen2(id_, name.c_str(), H5P_DEFAULT) : -1, H5Dclose);
  if (!set.good()) fail("has no " + name, "give a record that couplet has written");
  const Id space(H5Dget_space(set), H5Sclose), type(H5Dget_type(set), H5Tclose);
  const std::size_t length = H5Tget_size(type),
                    count = std::max<hssize_t>(H5Sget_simple_extent_npoints(space), 0);
  if (H5Tget_class(type) != H5T_STRING || H5Tis_variable_str(type) > 0)
    fail(name + " is not a text of ours", "give a record that couplet has written");
  std::string packed(length * count, '\0');
  if (count > 0 && H5Dread(set, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, packed.data()) < 0)
    fail("cannot read " + name, "the file is damaged: march again");
  std::vector<std::string> values;
  for (std::size_t i = 0; i < count; ++i) values.push_back(trimmed(packed.data() + i * length, length));
  return values;
}

std::string Hdf5File::text(const std::string& name) const {
  const auto all = texts(name);
  return all.empty() ? std::string() : all.front();
}

double Hdf5File::number_attribute(const std::string& object, const std::string& name) const {
  const Id set(
      has(object) ? H5Aopen_by_name(id_, object.c_str(), name.c_str(), H5P_DEFAULT, H5P_DEFAULT) : -1,
      H5Aclose);
  double value = 0;
  if (!set.good() || H5Aread(set, H5T_NATIVE_DOUBLE, &value) < 0)
    fail("has no " + name + " of " + object, "give a record that couplet has written");
  return value;
}

std::vector<std::string> Hdf5File::members(const std::string& group) const {
  std::vector<std::string> names;
  const Id in(has(group) ? H5Gopen2(id_, group.c_str(), H5P_DEFAULT) : -1, H5Gclose);
  if (!in.good()) return names;
  const auto collect = [](hid_t, const char* name, const H5L_info_t*, void* to) -> herr_t {
    static_cast<std::vector<std::string>*>(to)->emplace_back(name);
    return 0;
  };
  H5Literate(in, H5_INDEX_NAME, H5_ITER_INC, nullptr, collect, &names);
  return names;
}

void Hdf5File::flush_if_due() {
  if (std::chrono::steady_clock::now() - flushed_ >= flush_interval_) flush();
}

void Hdf5File::flush() {
  flushed_ = std::chrono::steady_clock::now();
  if (H5Fflush(id_, H5F_SCOPE_LOCAL) < 0) fail("cannot be flushed", "check that the disk is not full");
}

void Hdf5File::close() {
  if (id_ < 0) return;
  flush();
  if (H5Fclose(std::exchange(id_, -1)) < 0) fail("cannot be closed", "check that the disk is not full");
}

std::int64_t Hdf5File::create_column(const std::string& name, Number type, int chunk, const std::string& unit,
                                     const std::string& label) {
  const hsize_t none = 0, without_end = H5S_UNLIMITED, rows = static_cast<hsize_t>(chunk);
  const Id space(H5Screate_simple(1, &none, &without_end), H5Sclose);
  const Id settings = dataset_settings(), access(H5Pcreate(H5P_DATASET_ACCESS), H5Pclose);
  H5Pset_chunk(settings, 1, &rows);
  H5Pset_shuffle(settings);
  H5Pset_deflate(settings, compression);
  H5Pset_fill_time(settings, H5D_FILL_TIME_NEVER);
  // Chunks come whole and once: a cache would only hold memory.
  H5Pset_chunk_cache(access, 0, 0, 0);
  const hid_t stored = type == Number::real     ? H5T_IEEE_F64LE
                       : type == Number::single ? H5T_IEEE_F32LE
                                                : H5T_STD_I32LE;
  Id made(H5Dcreate2(id_, name.c_str(), stored, space, parents(), settings, access), H5Dclose);
  if (!made.good()) fail("cannot take " + name, "check that the disk is not full");
  if (!unit.empty()) attribute(name, "unit", unit);
  attribute(name, "label", label);
  return made.release();
}

void Hdf5File::write_rows(std::int64_t dataset, Number type, std::uint64_t at, std::uint64_t count,
                          const void* data) {
  const hsize_t extent = at + count, start = at, rows = count;
  bool good = H5Dset_extent(dataset, &extent) >= 0;
  const Id file_space(H5Dget_space(dataset), H5Sclose), memory(H5Screate_simple(1, &rows, nullptr), H5Sclose);
  good = good && H5Sselect_hyperslab(file_space, H5S_SELECT_SET, &start, nullptr, &rows, nullptr) >= 0;
  const hid_t held = type == Number::real     ? H5T_NATIVE_DOUBLE
                     : type == Number::single ? H5T_NATIVE_FLOAT
                                              : H5T_NATIVE_INT32;
  if (!good || H5Dwrite(dataset, held, memory, file_space, H5P_DEFAULT, data) < 0) {
    fail("cannot take more", "check that the disk is not full; what was flushed before can be read");
  }
}

void Hdf5File::close_column(std::int64_t dataset) { H5Dclose(dataset); }

template <class T>
Column<T>::Column(Hdf5File& file, const std::string& name, int chunk, const std::string& unit,
                  const std::string& label)
    : file_(&file), held_(chunk) {
  constexpr auto type = std::is_same_v<T, double>  ? Hdf5File::Number::real
                        : std::is_same_v<T, float> ? Hdf5File::Number::single
                                                   : Hdf5File::Number::index;
  id_ = file.create_column(name, type, chunk, unit, label);
}

template <class T>
Column<T>::Column(Column&& other) noexcept
    : file_(other.file_),
      id_(std::exchange(other.id_, -1)),
      held_(std::move(other.held_)),
      count_(other.count_),
      written_(other.written_) {}

template <class T>
Column<T>::~Column() {
  if (id_ >= 0) Hdf5File::close_column(id_);
}

template <class T>
void Column<T>::write_held() {
  constexpr auto type = std::is_same_v<T, double>  ? Hdf5File::Number::real
                        : std::is_same_v<T, float> ? Hdf5File::Number::single
                                                   : Hdf5File::Number::index;
  file_->write_rows(id_, type, written_, count_, held_.data());
  written_ += static_cast<std::uint64_t>(count_);
  count_ = 0;
}

template class Column<double>;
template class Column<float>;
template class Column<std::int32_t>;

}  // namespace couplet
