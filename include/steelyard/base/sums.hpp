// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <utility>

namespace steelyard::inline v1::detail {

/// Adds terms pairwise, like carries in a binary counter: term i meets the
/// others in a tree that depends on i alone, so the total has the same bits
/// however the terms were made, and its rounding error grows with log n, not n.
///   `Term` needs += and a default that is zero.
template <class Term>
class pairwise_sum {
 public:
  void add(Term term) {
    std::size_t level = 0;
    for (std::uint64_t full = terms_; (full & 1u) != 0; full >>= 1, ++level) {
      levels_[level] += term;
      term = std::move(levels_[level]);
    }
    levels_[level] = std::move(term);
    ++terms_;
  }

  /// Number of terms added.
  [[nodiscard]] std::uint64_t size() const noexcept { return terms_; }

  /// All terms, the subtotals added from the smallest up.
  [[nodiscard]] Term total() const {
    Term sum{};
    bool first = true;
    for (std::size_t level = 0; level < 64; ++level) {
      if (((terms_ >> level) & 1u) == 0) continue;
      Term subtotal = levels_[level];
      if (!first) subtotal += sum;
      sum = std::move(subtotal);
      first = false;
    }
    return sum;
  }

 private:
  Term levels_[64] = {};
  std::uint64_t terms_ = 0;
};

}  // namespace steelyard::inline v1::detail
