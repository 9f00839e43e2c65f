// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/sums.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>

namespace steelyard::inline v1::detail {

/// Draws positions in proportion to weights, one at a time, each from one word
/// and in constant time.                                        [Walker, ACM TOMS 3, 1977; Vose, IEEE TSE 17, 1991]
///   Shares are whole numbers that add up to n cells of capacity 2^b, about 2^62 in all, so that the table is built,
///   and can be checked, without rounding: only a weight's own share of the total is rounded.
/// Cost  16 bytes a weight; one table walk to build.
class alias_table {
 public:
  /// @pre weights finite and not negative, one of them positive
  explicit alias_table(std::span<double const> weights)
      : bits_(63 - static_cast<int>(std::bit_width(weights.size()))), cells_(weights.size()) {
    std::size_t const n = weights.size();
    std::vector<std::uint64_t> shares = shares_of(weights);
    std::vector<std::size_t> small, large;
    for (std::size_t i = 0; i < n; ++i) (shares[i] < capacity() ? small : large).push_back(i);
    while (!small.empty() && !large.empty()) {
      std::size_t const s = small.back(), l = large.back();
      small.pop_back();
      cells_[s] = {shares[s], l};
      shares[l] -= capacity() - shares[s];
      if (shares[l] >= capacity()) continue;
      large.pop_back();
      small.push_back(l);
    }
    for (std::size_t const l : large) cells_[l] = {capacity(), l};
  }

  [[nodiscard]] std::size_t size() const noexcept { return cells_.size(); }
  /// What a cell holds in all.
  [[nodiscard]] std::uint64_t capacity() const noexcept { return std::uint64_t{1} << bits_; }
  /// How much of cell i is position i's own; the rest is `alias(i)`'s.
  [[nodiscard]] std::uint64_t own(std::size_t i) const noexcept { return cells_[i].own; }
  [[nodiscard]] std::size_t alias(std::size_t i) const noexcept { return cells_[i].alias; }

  [[nodiscard]] std::size_t draw(draws& source) const {
    wide_product const place = multiply_wide(source(), cells_.size());
    cell const& at = cells_[static_cast<std::size_t>(place.high)];
    return place.low >> (64 - bits_) < at.own ? static_cast<std::size_t>(place.high) : at.alias;
  }

  /// Each weight as a whole number; together n times the capacity.
  [[nodiscard]] std::vector<std::uint64_t> shares_of(std::span<double const> weights) const {
    pairwise_sum<double> total;
    for (double const w : weights) total.add(w);
    std::uint64_t const whole = weights.size() * capacity();
    double const scale = static_cast<double>(whole) / total.total();
    std::vector<std::uint64_t> shares;
    std::uint64_t given = 0;
    for (double const w : weights) given += shares.emplace_back(static_cast<std::uint64_t>(w * scale));
    auto const heaviest = std::max_element(shares.begin(), shares.end());
    *heaviest += whole - given;  // what rounding left over, of either sign
    return shares;
  }

 private:
  struct cell {
    std::uint64_t own;
    std::size_t alias;
  };
  int bits_;
  std::vector<cell> cells_;
};

}  // namespace steelyard::inline v1::detail
