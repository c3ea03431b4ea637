// SPDX-License-Identifier: MIT
#include "engine/record/recorder.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace couplet {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();
constexpr double most_curvature = 0.05, most_third = 0.01, most_weight = 0.002;  // see recorder.h
constexpr int deepest = 40;              // halvings of a span: beyond a picosecond in a second
constexpr long settling_spans = 1000;    // ranges are renewed at each of the first ones, then once a period
constexpr double same_instant = 1e-14;   // of the time
constexpr double silence = 8;            // periods after which a silent probe is helped out
constexpr double most_change = 16;       // of the period's length against the expected one, for point spacing
constexpr double roundoff_range = 1e-9;  // of the largest signal of the same unit: ranges below are noise
constexpr std::size_t most_pieces = 1 << 15, most_happenings = 1 << 16;

}  // namespace

std::vector<int> choose_outputs(const Circuit& circuit, const std::vector<std::string>& names) {
  std::vector<int> chosen;
  if (names.empty()) {
    for (int row = 0; row < circuit.outputs(); ++row) chosen.push_back(row);
    return chosen;
  }
  std::string complaints;
  for (const auto& name : names) {
    int found = -1;
    for (int row = 0; row < circuit.outputs(); ++row) {
      if (circuit.output_name(row) == name) found = row;
    }
    if (found >= 0) {
      chosen.push_back(found);
      continue;
    }
    std::string known;
    for (int row = 0; row < circuit.outputs(); ++row)
      known += (row ? ", \"" : "\"") + circuit.output_name(row) + "\"";
    complaints += fmt::format("{}there is no signal \"{}\"; give one of {}", complaints.empty() ? "" : "\n",
                              name, known);
  }
  if (!complaints.empty()) throw InputError(complaints);
  return chosen;
}

void Recorder::Held::clear() {
  pieces.clear();
  states.clear();
  periods.clear();
  happenings.clear();
}

Recorder::Recorder(const Circuit& circuit, RecordWriter& writer, const RecorderSettings& settings)
    : writer_(writer),
      settings_(settings),
      outputs_(choose_outputs(circuit, settings.signals)),
      count_(static_cast<int>(outputs_.size())),
      stride_(padded(count_)),
      last_time_(-infinity),
      period_(settings.period),
      detail_left_(settings.start),
      written_until_(-infinity),
      last_point_(-infinity) {
  if (!(settings.period > 0)) throw std::logic_error("a recorder needs a period");
  std::vector<Signal> signals;
  for (int row : outputs_) {
    is_volts_.push_back(row < circuit.row_of_coil(0));
    signals.push_back({circuit.output_name(row), is_volts_.back() ? "V" : "A"});
  }
  writer_.begin(circuit.sheet(), signals);
  for (auto* b : {&first_, &last_, &cut_}) b->assign(2 * stride_, 0);
  halves_.assign(deepest, first_);
  for (auto* b : {&sum_, &range_}) b->assign(stride_, 0);
  low_.assign(stride_, infinity);
  high_.assign(stride_, -infinity);
  range_low_ = low_;
  range_high_ = high_;
  enter(circuit);
}

void Recorder::enter(const Circuit& circuit) {
  circuit_ = &circuit;
  n_ = circuit.size();
  state_stride_ = padded(n_);
  x_.assign(state_stride_, 0);
  next_ = x_;
  rows_.clear();
  evaluator_ = std::make_unique<ExactMarch>(circuit, MarchSettings{});
  last_topology_ = written_topology_ = -1;
  state_names_.clear();
  for (const auto& branch : circuit.sheet().branches) {
    auto& mine = state_names_.emplace_back();
    for (const auto& cell : branch.cells) mine.push_back(writer_.state_index(cell.state));
  }
}

const Buffer& Recorder::rows(const Topology& topology) {
  if (static_cast<int>(rows_.size()) <= topology.id) rows_.resize(topology.id + 1);
  Buffer& mine = rows_[topology.id];
  if (!mine.empty()) return mine;
  const Eigen::MatrixXd slopes = topology.C * topology.A;
  mine.assign(static_cast<std::size_t>(2 * stride_) * n_, 0);
  for (int c = 0; c < n_; ++c) {
    for (int i = 0; i < count_; ++i) {
      mine[static_cast<std::size_t>(c) * 2 * stride_ + i] = topology.C(outputs_[i], c);
      mine[static_cast<std::size_t>(c) * 2 * stride_ + stride_ + i] = slopes(outputs_[i], c);
    }
  }
  return mine;
}

void Recorder::span(const Span& span) {
  before_span(span.topology);
  const Buffer& mine = rows(*span.topology);
  if (last_topology_ == span.topology->id && continues(span)) {
    first_.swap(last_);
  } else {
    product(mine.data(), 2 * stride_, n_, span.x0, first_.data());
  }
  product(mine.data(), 2 * stride_, n_, span.x1, last_.data());
  if (spans_++ == 0) origin_ = period_start_ = span.start;
  hold(span);
  measure(span, mine);
  last_topology_ = span.topology->id;
  last_time_ = span.start + span.duration;
}

namespace {

// The two loops that run over every signal at every span. Signals are padded to whole vectors; padding is
// zero. Comparisons become vectors only where the compiler need not fear that they trap (nobody here asks for
// traps); functions of the library would not be inlined under that option.
#pragma GCC push_options
#pragma GCC optimize("no-trapping-math")

struct Bounds {
  const double *range, *low, *high;
};

COUPLET_WIDE
bool cubic_serves(int stride, double h, double weight, const double* at0, const double* at1,
                  const Bounds& bounds) {
  const double *slope0 = at0 + stride, *slope1 = at1 + stride;
  const double *range = bounds.range, *low = bounds.low, *high = bounds.high;
  long long coarse = 0;
  for (int i = 0; i < stride; ++i) {
    const double rise = at1[i] - at0[i], size = __builtin_fabs(rise);
    const double room = range[i] > size ? range[i] : size;
    const double curvature = 0.5 * h * __builtin_fabs(slope1[i] - slope0[i]);
    const double third = __builtin_fabs(0.5 * h * (slope0[i] + slope1[i]) - rise);
    const double reach = 0.25 * h * (__builtin_fabs(slope0[i]) + __builtin_fabs(slope1[i]));
    const double top = (at0[i] > at1[i] ? at0[i] : at1[i]) + reach,
                 bottom = (at0[i] < at1[i] ? at0[i] : at1[i]) - reach;
    const long long bent = (curvature > most_curvature * room ? 1 : 0) | (third > most_third * room ? 1 : 0);
    const long long leaves = (top > high[i] ? 1 : 0) | (bottom < low[i] ? 1 : 0);
    coarse |= (bent & leaves) | (curvature * weight > room ? 1 : 0);
  }
  return coarse == 0;
}

/// Takes the ends and the integral in; true where some cubic turns in between and may leave the range so far.
COUPLET_WIDE
bool gather_ends(int stride, double h, const double* at0, const double* at1, double* __restrict low,
                 double* __restrict high, double* __restrict sum) {
  const double *slope0 = at0 + stride, *slope1 = at1 + stride;
  const double half = 0.5 * h, twelfth = h * h / 12;
  long long turns = 0;
  for (int i = 0; i < stride; ++i) {
    const double bottom = at0[i] < at1[i] ? at0[i] : at1[i], top = at0[i] > at1[i] ? at0[i] : at1[i];
    const double lowest = low[i] < bottom ? low[i] : bottom, highest = high[i] > top ? high[i] : top;
    low[i] = lowest;
    high[i] = highest;
    sum[i] += half * (at0[i] + at1[i]) + twelfth * (slope0[i] - slope1[i]);
    // A cubic rises or falls throughout where both slopes point along the rise and are at most three times
    // it.
    const double rise = at1[i] - at0[i], most = 3 * rise * rise;
    const double a = slope0[i] * h * rise, b = slope1[i] * h * rise;
    const double reach = 0.25 * h * (__builtin_fabs(slope0[i]) + __builtin_fabs(slope1[i]));
    const long long leaves = (top + reach > highest ? 1 : 0) | (bottom - reach < lowest ? 1 : 0);
    turns |= leaves & ((a < 0 ? 1 : 0) | (b < 0 ? 1 : 0) | (a > most ? 1 : 0) | (b > most ? 1 : 0));
  }
  return turns != 0;
}

#pragma GCC pop_options

}  // namespace

/// Whether the cubic is good enough for what it may change (see recorder.h).
bool Recorder::resolved(double h, const double* at0, const double* at1) const {
  return cubic_serves(stride_, h, h / (most_weight * period_), at0, at1,
                      {range_.data(), low_.data(), high_.data()});
}

void Recorder::gather(double h, const double* at0, const double* at1) {
  if (gather_ends(stride_, h, at0, at1, low_.data(), high_.data(), sum_.data())) gather_turns(h, at0, at1);
  if (spans_ < settling_spans) renew_ranges();
}

/// The cubic's own extremes, where they leave the range so far.
void Recorder::gather_turns(double h, const double* at0, const double* at1) {
  for (int i = 0; i < count_; ++i) {
    const double s0 = h * at0[stride_ + i], s1 = h * at1[stride_ + i], rise = at1[i] - at0[i];
    const double reach = 0.25 * (std::abs(s0) + std::abs(s1));
    if (std::max(at0[i], at1[i]) + reach <= high_[i] && std::min(at0[i], at1[i]) - reach >= low_[i]) continue;
    // w(u) = w0 + s0 u + q u^2 + c u^3; w'(u) = s0 + 2 q u + 3 c u^2
    const double q = 3 * rise - 2 * s0 - s1, c = s0 + s1 - 2 * rise;
    const double inside = q * q - 3 * c * s0;
    if (!(inside >= 0)) continue;
    const double big = -(q + std::copysign(std::sqrt(inside), q));
    for (const double u : {big / (3 * c), s0 / big}) {
      if (!(u > 0 && u < 1)) continue;
      const double value = at0[i] + u * (s0 + u * (q + u * c));
      low_[i] = std::min(low_[i], value);
      high_[i] = std::max(high_[i], value);
    }
  }
}

void Recorder::measure_part(const Span& span, const Buffer& mine, double from, double to, const double* at0,
                            const double* at1, int depth) {
  const double middle = 0.5 * (from + to);
  if (depth == deepest || resolved(to - from, at0, at1) || !(middle > from && middle < to))
    return gather(to - from, at0, at1);
  span.between->at(middle, x_.data());
  double* half = halves_[depth].data();
  product(mine.data(), 2 * stride_, n_, x_.data(), half);
  measure_part(span, mine, from, middle, at0, half, depth + 1);
  measure_part(span, mine, middle, to, half, at1, depth + 1);
}

/// The span, cut at the ends of periods that fall inside by the clock.
void Recorder::measure(const Span& span, const Buffer& mine) {
  const double end = span.start + span.duration;
  double from = 0;
  while (due() < end) {
    const double when = due(), to = when - span.start;
    if (to > from) {
      span.between->at(to, x_.data());
      product(mine.data(), 2 * stride_, n_, x_.data(), cut_.data());
      measure_part(span, mine, from, to, first_.data(), cut_.data(), 0);
      first_.swap(cut_);
      from = to;
    }
    close_period(when, Closing::clock);
  }
  if (span.duration > from) measure_part(span, mine, from, span.duration, first_.data(), last_.data(), 0);
}

double Recorder::due() const {
  if (settings_.probe < 0) return origin_ + static_cast<double>(clock_ticks_ + 1) * settings_.period;
  return period_start_ + silence * std::max(period_, settings_.period);
}

void Recorder::close_period(double time, Closing closing) {
  ++clock_ticks_;
  const double duration = time - period_start_;
  if (!(duration > 0)) return;
  renew_ranges();
  for (int i = 0; i < count_; ++i) sum_[i] /= duration;
  writer_.period(period_start_, duration, low_.data(), high_.data(), sum_.data());
  std::fill(low_.begin(), low_.end(), infinity);
  std::fill(high_.begin(), high_.end(), -infinity);
  std::fill(sum_.begin(), sum_.end(), 0.0);
  if (closing == Closing::probe && last_closing_ == Closing::probe) {
    period_ = std::clamp(duration, settings_.period / most_change, settings_.period * most_change);
  }
  last_closing_ = closing;
  period_start_ = time;

  now_.periods.push_back(now_.pieces.size());
  if (detailed()) {
    write(now_, 0);
    now_.clear();
    settled_ = 0;
    --detail_left_;
  } else if (static_cast<int>(now_.periods.size()) >= settings_.last) {
    std::swap(before_, now_);
    now_.clear();
    settled_ = 0;
  }
  detail_left_ = std::max(detail_left_, 0);
}

/// Ranges of the march so far. Those below the round-off of larger signals of the same unit are not worth
/// halvings.
void Recorder::renew_ranges() {
  double largest[2] = {0, 0};
  for (int i = 0; i < count_; ++i) {
    range_low_[i] = std::min(range_low_[i], low_[i]);
    range_high_[i] = std::max(range_high_[i], high_[i]);
    largest[is_volts_[i]] =
        std::max({largest[is_volts_[i]], std::abs(range_low_[i]), std::abs(range_high_[i])});
  }
  for (int i = 0; i < count_; ++i)
    range_[i] = std::max(range_high_[i] - range_low_[i], roundoff_range * largest[is_volts_[i]]);
}

void Recorder::event(const Event& event) {
  int name = -1;
  const Sheet& sheet = circuit_->sheet();
  if (event.kind == Event::Kind::probe) {
    name = static_cast<int>(sheet.parts.size()) + event.condition;
    if (event.condition == settings_.probe && event.bit) probe_rose_ = true, probe_time_ = event.time;
  } else if (event.branch >= 0) {
    name = sheet.branches[event.branch].part;
  }
  if (!now_.pieces.empty()) {
    now_.pieces.back().event_after = true;
    now_.pieces.back().end = last_time_ = event.time;
  }
  now_.happenings.push_back({event.time, event.kind, name, event.branch, -1});
}

/// What the events since the last span have led to is known only now.
void Recorder::before_span(const Topology* topology) {
  for (; settled_ < now_.happenings.size(); ++settled_) {
    auto& happening = now_.happenings[settled_];
    if (topology && happening.branch >= 0)
      happening.state = state_names_[happening.branch][topology->cells[happening.branch]];
  }
  if (probe_rose_) close_period(probe_time_, Closing::probe);
  probe_rose_ = false;
}

void Recorder::mark(double time) {
  marks_.insert(std::upper_bound(marks_.begin(), marks_.end(), time), time);
}

void Recorder::follow(const Circuit& circuit) {
  before_span(nullptr);
  write_held(settings_.around);
  detail_left_ = std::max(detail_left_, settings_.around);
  enter(circuit);
}

void Recorder::finish() {
  before_span(nullptr);
  write_held(detailed() ? std::numeric_limits<int>::max() : settings_.last);
  close_period(last_time_, Closing::clock);
}

/// Marches keep time to more than its last digit: a span's start and duration need not add up to the next
/// one's start.
bool Recorder::continues(const Span& span) const {
  return std::abs(span.start - last_time_) <= same_instant * std::abs(span.start);
}

void Recorder::hold(const Span& span) {
  if (!marks_.empty() && span.start >= marks_.front()) {
    while (!marks_.empty() && span.start >= marks_.front()) marks_.erase(marks_.begin());
    write_held(settings_.around);
    detail_left_ = std::max(detail_left_, settings_.around);
  }
  if (now_.pieces.size() >= most_pieces || now_.happenings.size() >= most_happenings) {
    // A period of very many pieces: keep memory bounded.
    if (detailed()) {
      write(now_, 0);
    } else {
      std::swap(before_, now_);
    }
    now_.clear();
    settled_ = 0;
  }
  const bool joins = !now_.pieces.empty() && continues(span);
  if (joins) now_.pieces.back().end = span.start;
  auto& states = now_.states;
  const std::size_t stride = state_stride_;
  if (!joins) {
    states.insert(states.end(), span.x0, span.x0 + n_);
    states.resize(states.size() + stride - n_, 0.0);
  }
  now_.pieces.push_back({span.topology->id, span.start, span.duration, span.start + span.duration,
                         states.size() / stride - 1, false});
  states.insert(states.end(), span.x1, span.x1 + n_);
  states.resize(states.size() + stride - n_, 0.0);
}

/// Writes the last `periods` whole periods that are held, and the one under way.
void Recorder::write_held(int periods) {
  const std::size_t whole = before_.periods.size() + now_.periods.size(),
                    wanted = static_cast<std::size_t>(std::max(periods, 0));
  const std::size_t skip = whole > wanted ? whole - wanted : 0, in_before = before_.periods.size();
  if (skip < in_before || skip == 0) write(before_, skip == 0 ? 0 : before_.periods[skip - 1]);
  write(now_, skip > in_before ? now_.periods[skip - in_before - 1] : 0);
  before_.clear();
  now_.clear();
  settled_ = 0;
}

void Recorder::write(const Held& held, std::size_t first) {
  if (first >= held.pieces.size()) return;
  const double spacing = period_ / settings_.points;
  for (std::size_t p = first; p < held.pieces.size(); ++p) {
    const auto& piece = held.pieces[p];
    const Topology& topology = circuit_->topology_by_id(piece.topology);
    const double *x0 = &held.states[piece.state * state_stride_], *x1 = x0 + state_stride_;
    const double h = piece.duration, end = piece.end;
    if (std::abs(piece.start - written_until_) > same_instant * piece.start) {
      writer_.new_stretch();
      last_point_ = -infinity;
      written_topology_ = -1;
    }
    const bool changed = written_topology_ != piece.topology;
    if (changed) write_regions(piece.topology, piece.start);
    if (changed || (end - last_point_ > spacing && piece.start > last_point_))
      point(topology, piece.start, x0);
    if (h > spacing) {
      const int steps = static_cast<int>(std::ceil(h / spacing));
      const Flow& flow = evaluator_->flow(topology);
      std::copy_n(x0, state_stride_, x_.begin());
      for (int i = 1; i < steps; ++i) {
        evaluator_->advance(flow, x_.data(), h / steps, next_.data());
        x_.swap(next_);
        point(topology, piece.start + h * i / steps, x_.data());
      }
    }
    const bool ends = p + 1 == held.pieces.size() || piece.event_after ||
                      held.pieces[p + 1].topology != piece.topology || held.pieces[p + 1].start != end;
    if (ends) point(topology, end, x1);
    written_until_ = end;
  }
  for (const auto& happening : held.happenings) {
    if (happening.time >= held.pieces[first].start)
      writer_.event(happening.time, happening.kind, happening.name, happening.state);
  }
}

void Recorder::write_regions(int topology, double time) {
  const auto& branches = circuit_->sheet().branches;
  const auto& cells = circuit_->topology_by_id(topology).cells;
  for (std::size_t b = 0; b < branches.size(); ++b) {
    if (branches[b].cells.size() < 2) continue;
    if (written_topology_ >= 0 && circuit_->topology_by_id(written_topology_).cells[b] == cells[b]) continue;
    writer_.region(time, static_cast<int>(b), state_names_[b][cells[b]]);
  }
  written_topology_ = topology;
}

void Recorder::point(const Topology& topology, double time, const double* x) {
  // One evaluation for values and slopes costs little more than one for values.
  product(rows(topology).data(), 2 * stride_, n_, x, cut_.data());
  writer_.full(time, cut_.data());
  last_point_ = time;
}

}  // namespace couplet
