// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <utility>

#include <steelyard/estimate/block.hpp>
#include <steelyard/estimate/column_parts.hpp>
#include <steelyard/estimate/whole_columns.hpp>

namespace steelyard::inline v1::detail {

struct group_facts;

/// An estimator that wants the whole of a kept sample at once: what blocks held is handed over when it answers.
template <class E>
class everything_slot {
 public:
  explicit everything_slot(E empty) : empty_(std::move(empty)) {}
  [[nodiscard]] everything_slot fresh() const { return everything_slot(empty_.fresh()); }
  [[nodiscard]] E& prepared() noexcept { return empty_; }

  void add(block const& b, std::size_t column, std::size_t columns) {
    weighted_view const v = b.view(column, columns);
    if (v.weights.empty()) return;
    columns_ = columns;
    parts_.take(v);
  }
  void rescale(double factor) { parts_.rescale(factor); }
  everything_slot& operator+=(everything_slot const& other) {
    parts_ += other.parts_;
    if (other.columns_ > columns_) columns_ = other.columns_;
    return *this;
  }

  [[nodiscard]] auto answer(run_facts const& facts, group_facts const&) const {
    if constexpr (requires { empty_.answer_from(parts_, facts); }) {  // needs no copy of its own
      return empty_.answer_from(parts_, facts);
    } else {
      whole_columns const all(parts_, columns_);
      weighted_view const v = all.view(facts.how);
      E whole = empty_.fresh();
      whole.add(v.values, v.weights, v);
      return whole.answer(facts);
    }
  }

 private:
  E empty_;
  std::size_t columns_ = 1;
  column_parts parts_;
};

}  // namespace steelyard::inline v1::detail
