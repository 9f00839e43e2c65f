// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/kernels.hpp>

namespace steelyard::inline v1::detail {

/// Turns weights to whole numbers that add up to `whole`, so that running sums
/// of any length are exact: only a weight's own share is rounded, to one part
/// in `whole` of the total.
class whole_shares {
 public:
  /// @pre weights finite and not negative; whole <= 2^62
  whole_shares(std::span<double const> weights, std::uint64_t whole) {
    double const total = total_of(weights);
    if (!(total > 0.0)) return;
    lift_ = total < 0x1p-900 ? 0x1p600 : 1.0;
    factor_ = static_cast<double>(whole) / fence(total * lift_);
  }
  [[nodiscard]] std::uint64_t operator()(double weight) const noexcept {
    // Fenced, since lift times factor alone may overflow.
    return static_cast<std::uint64_t>(static_cast<std::int64_t>(fence(weight * lift_) * factor_ + 0.5));
  }

 private:
  double lift_ = 1.0, factor_ = 0.0;
};

/// Bits behind the point where k draws together make up at most 2^62.
inline int share_bits(std::size_t k) noexcept { return 62 - static_cast<int>(std::bit_width(std::uint64_t{k})); }

/// The last position of positive weight: what rounding leaves over goes there.
inline std::size_t last_position(std::span<double const> weights) noexcept {
  std::size_t last = weights.size();
  while (last > 1 && !(weights[last - 1] > 0.0)) --last;
  return last - 1;
}

/// Running sums of shares, made in short runs as they are wanted.
class running_shares {
 public:
  static constexpr std::size_t run = 256;

  running_shares(std::span<double const> weights, std::uint64_t whole)
      : weights_(weights.first(last_position(weights) + 1)), shares_(weights, whole) {
    starts_.reserve(weights_.size() / run + 1);
    std::uint64_t sum = 0;
    for (std::size_t from = 0; from < weights_.size(); from += run) {
      starts_.push_back(sum);
      for (std::size_t i = from; i < std::min(from + run, weights_.size()); ++i) sum += shares_(weights_[i]);
    }
  }
  /// The run in which the running sum passes a point.
  [[nodiscard]] std::size_t run_of(std::uint64_t point) const noexcept {
    return static_cast<std::size_t>(std::upper_bound(starts_.begin(), starts_.end(), point) - starts_.begin()) - 1;
  }
  /// Sums after each weight of run r, the very last one out of reach of any point; returns how many.
  std::size_t fill(std::size_t r, std::uint64_t* ends) const noexcept {
    std::size_t const from = r * run, n = std::min(run, weights_.size() - from);
    std::uint64_t sum = starts_[r];
    for (std::size_t i = 0; i < n; ++i) ends[i] = sum += shares_(weights_[from + i]);
    if (from + n == weights_.size()) ends[n - 1] = (std::uint64_t{1} << 63) - 1;
    return n;
  }

 private:
  std::span<double const> weights_;
  whole_shares shares_;
  std::vector<std::uint64_t> starts_;
};

/// Where points in rising order fall among the weights, laid end to end.
/// @param points  in units of 1/whole of the total weight; become the positions
/// Cost  two walks over the weights, one over the points, without branches that depend on them: three stretches at a time,
///       so that each one's waits are filled by the others.
inline void points_to_positions(std::span<double const> weights, std::uint64_t whole, std::span<std::size_t> points) {
  struct strand {
    std::uint64_t ends[running_shares::run];
    std::uint64_t point;         // the one to place next
    std::size_t j, stop;         // its number, and the first that is not ours
    std::size_t r, i, size;      // the run of weights at hand, the place in it, and its length
  };
  constexpr std::size_t count = 3;
  running_shares const sums(weights, whole);
  std::size_t const k = points.size();
  strand all[count] = {};
  for (std::size_t s = 0; s < count; ++s) {
    strand& a = all[s];
    a.j = k / count * s;
    a.stop = s + 1 < count ? k / count * (s + 1) : k;
    if (a.j == a.stop) continue;
    a.point = points[a.j];
    a.r = sums.run_of(a.point);
    a.i = 0;
    a.size = sums.fill(a.r, a.ends);
  }
  std::size_t* const to = points.data();
  // Either places the point or passes a weight. The next point is read first, since the place is written in any case.
  auto const turn = [](std::uint64_t const* ends, std::size_t first, std::uint64_t& point, std::size_t*& at, std::size_t& i) {
    std::uint64_t const next = at[1];
    std::uint64_t const here = (point - ends[i]) >> 63;  // 1 where the point lies below: both are less than 2^63
    *at = first + i;
    point ^= (point ^ next) & (std::uint64_t{0} - here);
    at += here;
    i += 1 - here;
  };
  auto const step = [&](strand& a) {
    std::size_t* at = to + a.j;
    turn(a.ends, a.r * running_shares::run, a.point, at, a.i);
    a.j = static_cast<std::size_t>(at - to);
  };
  auto const look_on = [&](strand& a) {  // in the next run of weights, where one is at its end
    if (a.i < a.size) return;
    a.size = sums.fill(++a.r, a.ends);
    a.i = 0;
  };
  auto const more = [&](strand& a) {
    if (a.j + 1 >= a.stop) return false;
    look_on(a);
    return true;
  };
  while (true) {
    bool const first = more(all[0]), second = more(all[1]), third = more(all[2]);
    if (!(first && second && third)) break;
    std::size_t turns = running_shares::run;  // that no strand runs out in
    for (strand const& a : all) turns = std::min({turns, a.stop - 1 - a.j, a.size - a.i});
    std::uint64_t p0 = all[0].point, p1 = all[1].point, p2 = all[2].point;
    std::size_t *at0 = to + all[0].j, *at1 = to + all[1].j, *at2 = to + all[2].j;
    std::size_t i0 = all[0].i, i1 = all[1].i, i2 = all[2].i;
    std::size_t const f0 = all[0].r * running_shares::run, f1 = all[1].r * running_shares::run, f2 = all[2].r * running_shares::run;
    for (; turns > 0; --turns) {
      turn(all[0].ends, f0, p0, at0, i0);
      turn(all[1].ends, f1, p1, at1, i1);
      turn(all[2].ends, f2, p2, at2, i2);
    }
    all[0].point = p0;
    all[1].point = p1;
    all[2].point = p2;
    all[0].j = static_cast<std::size_t>(at0 - to);
    all[1].j = static_cast<std::size_t>(at1 - to);
    all[2].j = static_cast<std::size_t>(at2 - to);
    all[0].i = i0;
    all[1].i = i1;
    all[2].i = i2;
  }
  for (strand& a : all) {
    while (more(a)) step(a);
    if (a.j == a.stop) continue;
    while (true) {  // the last one, with no next
      look_on(a);
      if (a.point < a.ends[a.i]) break;
      ++a.i;
    }
    to[a.j] = a.r * running_shares::run + a.i;
  }
}

}  // namespace steelyard::inline v1::detail
