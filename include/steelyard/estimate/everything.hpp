// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/estimate/block.hpp>

namespace steelyard::inline v1::detail {

struct group_facts;

/// An estimator that wants the whole of a kept sample at once: blocks are held
/// by pointer, so that merging moves no values, and handed over when it answers.
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
    parts_.push_back({std::make_shared<part const>(part{{v.values.begin(), v.values.end()},
                                                        {v.weights.begin(), v.weights.end()},
                                                        {v.counts.begin(), v.counts.end()},
                                                        {v.groups.begin(), v.groups.end()}}),
                      1.0});
  }
  void rescale(double factor) {
    for (held& each : parts_) each.factor *= factor;
  }
  everything_slot& operator+=(everything_slot const& other) {
    parts_.insert(parts_.end(), other.parts_.begin(), other.parts_.end());
    if (other.columns_ > columns_) columns_ = other.columns_;
    return *this;
  }

  [[nodiscard]] auto answer(run_facts const& facts, group_facts const&) const {
    std::size_t n = 0;
    for (held const& each : parts_) n += each.of->weights.size();
    part all;
    all.values.reserve(n * columns_);
    all.weights.reserve(n);
    for (std::size_t c = 0; c < columns_; ++c)
      for (held const& each : parts_) {
        auto const from = each.of->values.begin() + static_cast<std::ptrdiff_t>(c * each.of->weights.size());
        all.values.insert(all.values.end(), from, from + static_cast<std::ptrdiff_t>(each.of->weights.size()));
      }
    for (held const& each : parts_) {
      for (double const w : each.of->weights) all.weights.push_back(w * each.factor);
      all.counts.insert(all.counts.end(), each.of->counts.begin(), each.of->counts.end());
      all.groups.insert(all.groups.end(), each.of->groups.begin(), each.of->groups.end());
    }
    weighted_view v;
    v.values = all.values;
    v.weights = all.weights;
    v.counts = all.counts;
    v.groups = all.groups;
    v.how = facts.how;
    if constexpr (requires { empty_.answer_from(v, facts); }) {  // needs no copy of its own
      return empty_.answer_from(v, facts);
    } else {
      E whole = empty_.fresh();
      whole.add(v.values, v.weights, v);
      return whole.answer(facts);
    }
  }

 private:
  struct part {
    std::vector<double> values, weights;
    std::vector<std::uint64_t> counts;
    std::vector<std::uint32_t> groups;
  };
  struct held {
    std::shared_ptr<part const> of;
    double factor;
  };

  E empty_;
  std::size_t columns_ = 1;
  std::vector<held> parts_;
};

}  // namespace steelyard::inline v1::detail
