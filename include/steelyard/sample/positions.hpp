// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <span>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/isa.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/share_lanes.hpp>

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
  /// Running sums of the shares of whole groups of eight weights, in units of 2^shift; returns the last, in full.
  std::uint64_t running(isa width, double const* weights, std::uint64_t sum, int shift, std::uint64_t* sums,
                        std::size_t groups) const noexcept {
    return running_sums(width, weights, lift_, factor_, sum, shift, sums, groups);
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

/// Running sums of weights' shares, one window after another.
class running_shares {
 public:
  static constexpr std::size_t window = 1024;

  /// Sums from `start` on, in units of 2^shift. @pre the weights' last is positive
  running_shares(std::span<double const> weights, whole_shares const& shares, std::uint64_t start = 0, int shift = 0) noexcept
      : weights_(weights), shares_(shares), sum_(start), shift_(shift) {}

  /// Makes the next window's sums; false where there are no more weights.
  bool next(isa width) noexcept {
    first_ += size_;
    size_ = std::min(window, weights_.size() - first_);
    if (size_ == 0) return false;
    double const* const from = weights_.data() + first_;
    std::size_t const groups = size_ / virtual_lanes, rest = size_ % virtual_lanes;
    sum_ = shares_.running(width, from, sum_, shift_, sums_, groups);
    if (rest != 0) {
      double few[virtual_lanes] = {};
      std::memcpy(few, from + size_ - rest, rest * sizeof(double));
      sum_ = shares_.running(width, few, sum_, shift_, sums_ + size_ - rest, 1);
    }
    return true;
  }
  /// Number of the window's first weight.
  [[nodiscard]] std::size_t first() const noexcept { return first_; }
  [[nodiscard]] std::size_t size() const noexcept { return size_; }
  /// Sums after each weight of the window; there is room for `share_padding` more.
  [[nodiscard]] std::uint64_t* sums() noexcept { return sums_; }
  [[nodiscard]] bool at_end() const noexcept { return first_ + size_ == weights_.size(); }

 private:
  std::span<double const> weights_;
  whole_shares shares_;
  std::uint64_t sum_;
  int shift_;
  std::size_t first_ = 0, size_ = 0;
  std::uint64_t sums_[window + share_padding];
};

/// Where points in rising order fall among the weights, laid end to end.
/// @param next_points  called as next_points(from, n, to) to write points from .. from + n - 1, in units of 1/whole of the
///                     total weight, to `to`, where there is room up to a multiple of eight. Called in order; may read
///                     positions[from] on, which are not written yet then.
/// Cost  two walks over the weights, one over the points, without branches that depend on either.
template <class Points>
void lay_out(std::span<double const> weights, std::uint64_t whole, std::span<std::size_t> positions, Points next_points,
             isa width = widest_isa()) {
  constexpr std::size_t batch = 1024;
  std::uint64_t points[batch];
  running_shares shares(weights.first(last_position(weights) + 1), whole_shares(weights, whole));
  std::size_t passed = 0;  // of the window's sums
  for (std::size_t from = 0; from < positions.size(); from += batch) {
    std::size_t const size = std::min(batch, positions.size() - from);
    next_points(from, size, points);
    for (std::size_t at = 0; at < size;) {
      if (passed == shares.size()) {
        shares.next(width);
        passed = 0;
        std::uint64_t* const behind = shares.sums() + shares.size();
        if (shares.at_end()) behind[-1] = out_of_reach;
        std::fill(behind, behind + share_padding, out_of_reach);
      }
      std::uint64_t const* const sums = shares.sums() + passed;
      std::size_t const left = shares.size() - passed;
      std::size_t const n = points[size - 1] < sums[left - 1]
                                ? size - at
                                : static_cast<std::size_t>(std::lower_bound(points + at, points + size, sums[left - 1]) - (points + at));
      if (n > 0) lay_points(width, points + at, n, sums, left, shares.first() + passed, positions.data() + from + at);
      at += n;
      passed = at < size ? shares.size() : positions[from + size - 1] - shares.first();
    }
  }
}

/// The same, of points that stand where their positions are wanted.
inline void points_to_positions(std::span<double const> weights, std::uint64_t whole, std::span<std::size_t> points,
                                isa width = widest_isa()) {
  lay_out(weights, whole, points, [&](std::size_t from, std::size_t n, std::uint64_t* to) {
    for (std::size_t j = 0; j < n; ++j) to[j] = points[from + j];
  }, width);
}

}  // namespace steelyard::inline v1::detail
