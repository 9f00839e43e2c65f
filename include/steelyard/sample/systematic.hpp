// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/isa.hpp>
#include <steelyard/base/mark_lanes.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Writes copies of positions one after another, given where each one's copies end: each position is marked where its
/// copies begin, and marks are spread up to the next. No branch depends on how many copies there are.
class copies_writer {
 public:
  copies_writer(std::span<std::size_t> out, isa width) noexcept
      : out_(out),
        skew_(reinterpret_cast<std::uintptr_t>(out.data()) / sizeof(std::size_t) % line),
        width_(width),
        past_caches_(out.size() >= (std::size_t{1} << 22)) {}

  [[nodiscard]] bool full() const noexcept { return from_ >= out_.size(); }

  /// Copies of first, first + 1, ... up to these ends, which rise.
  void write(std::size_t first, std::uint64_t const* ends, std::size_t n) noexcept {
    for (std::size_t i = 0; i < n && !full();) {
      std::uint64_t const reach = done_ + room;
      std::size_t const stop = ends[n - 1] <= reach ? n : static_cast<std::size_t>(std::upper_bound(ends + i, ends + n, reach) - ends);
      if (stop == i) {  // one with many copies
        std::size_t const to = static_cast<std::size_t>(std::min<std::uint64_t>(ends[i], out_.size()));
        spread(from_);
        marks_[0] = 0;
        std::fill(out_.begin() + static_cast<std::ptrdiff_t>(from_), out_.begin() + static_cast<std::ptrdiff_t>(to), first + i);
        from_ = done_ = to;
        marks_[0] = mark_of_first + first + ++i;
        continue;
      }
      std::uint64_t const start = done_, mark = mark_of_first + first + 1;
      for (; i + 4 <= stop; i += 4) {  // four at a time take half the time
        std::uint64_t const a = ends[i] - start, b = ends[i + 1] - start, c = ends[i + 2] - start, d = ends[i + 3] - start;
        marks_[a] = mark + i;
        marks_[b] = mark + i + 1;
        marks_[c] = mark + i + 2;
        marks_[d] = mark + i + 3;
      }
      for (; i < stop; ++i) marks_[ends[i] - start] = mark + i;
      from_ = static_cast<std::size_t>(ends[stop - 1]);
      if (full()) continue;
      std::size_t const whole = (from_ + skew_) / line * line;  // whole cache lines
      if (whole <= done_ + skew_) continue;
      std::size_t const before = done_;
      spread(whole - skew_);
      for (std::size_t j = done_; j <= from_; ++j) {
        marks_[j - done_] = marks_[j - before];
        marks_[j - before] = 0;
      }
    }
  }
  /// Copies of `last` to the end.
  void finish(std::size_t last) noexcept {
    std::size_t const to = std::min(from_, out_.size());
    spread(to);
    std::fill(out_.begin() + static_cast<std::ptrdiff_t>(to), out_.end(), last);
    if (past_caches_) past_caches_done();
  }

 private:
  static constexpr std::size_t room = 2048, line = 8;

  void spread(std::size_t to) noexcept {
    top_ = spread_marks(width_, marks_, to - done_, top_, out_.data() + done_, past_caches_);
    done_ = to;
  }

  std::span<std::size_t> out_;
  std::size_t skew_;       // places from the start of a cache line to out's first
  std::size_t from_ = 0;   // where the next copies begin
  std::size_t done_ = 0;   // what is written; marks_[0] is that of the next place
  std::uint64_t top_ = mark_of_first;  // of the last position written
  isa width_;
  bool past_caches_;
  std::uint64_t marks_[room + 1] = {};
};

/// Positions of k draws in rising order, by steps of equal length from one
/// uniform start: copies of i are the points j + u that fall below the running sum of k W.
///   unbiased; expected copies k W_i                          [Douc, Cappe & Moulines 2005]
/// Cost  two walks over the weights, one over the positions, about 2 ns a weight and a draw in all, whatever the weights.
inline void systematic_positions(std::span<double const> weights, double u, std::span<std::size_t> positions,
                                 isa width = widest_isa()) {
  std::size_t const k = positions.size(), last = last_position(weights);
  int const bits = share_bits(k);
  std::uint64_t const one = std::uint64_t{1} << bits;
  whole_shares const shares(weights, k * one);
  std::uint64_t sum = one - 1 - static_cast<std::uint64_t>(u * static_cast<double>(one));
  running_shares parts(weights.first(last), shares, sum, bits);
  copies_writer copies(positions, width);
  while (!copies.full() && parts.next(width)) copies.write(parts.first(), parts.sums(), parts.size());
  copies.finish(last);
}
inline std::vector<std::size_t> systematic_positions(std::span<double const> weights, std::size_t k, double u) {
  std::vector<std::size_t> positions(k);
  systematic_positions(weights, u, positions);
  return positions;
}

/// Variance of the mean over k systematic draws, given weights and values: exact,
/// since the mean is a step function of the one uniform number.
///   k M(U) = const - sum_i (f_i - f_(i+1)) 1{U > frac(k C_i)}
/// Cost  one sort of the fractions.
inline double systematic_variance(std::span<double const> weights, std::span<double const> values, std::size_t k) {
  double total = 0.0;
  for (double const w : weights) total += w;
  struct jump {
    double at, size;
  };
  std::vector<jump> jumps;
  double sum = 0.0, before = 0.0;
  bool any = false;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    if (!(weights[i] > 0.0)) continue;
    if (any) {
      double const place = sum / total * static_cast<double>(k);
      jumps.push_back({place - static_cast<double>(static_cast<std::uint64_t>(place)), values[i] - before});
    }
    sum += weights[i];
    before = values[i];
    any = true;
  }
  std::sort(jumps.begin(), jumps.end(), [](jump const& a, jump const& b) { return a.at < b.at; });
  double level = 0.0, start = 0.0, mean = 0.0;
  for (jump const& each : jumps) {
    mean += level * (each.at - start);
    level += each.size;
    start = each.at;
  }
  mean += level * (1.0 - start);
  double variance = 0.0;
  level = start = 0.0;
  for (jump const& each : jumps) {
    variance += (level - mean) * (level - mean) * (each.at - start);
    level += each.size;
    start = each.at;
  }
  variance += (level - mean) * (level - mean) * (1.0 - start);
  return variance / (static_cast<double>(k) * static_cast<double>(k));
}

}  // namespace steelyard::inline v1::detail
