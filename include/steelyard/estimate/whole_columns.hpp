// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/estimate/column_parts.hpp>
#include <steelyard/estimate/run_facts.hpp>

namespace steelyard::inline v1::detail {

/// Readout columns of a whole sample, one after another, with weights, counts and groups. They may be lent as parts, which
/// are never changed again: what goes on after that is a copy.
class whole_columns {
 public:
  whole_columns() = default;
  /// @param columns  how many there are in each part
  whole_columns(column_parts const& parts, std::size_t columns) {
    vectors& to = own();
    to.values.reserve(parts.size() * columns);
    to.weights.reserve(parts.size());
    for (std::size_t c = 0; c < columns; ++c)
      for (auto const& each : parts) append(to.values, each.values + c * each.size, each.size);
    for (auto const& each : parts) {
      for (std::size_t i = 0; i < each.size; ++i) to.weights.push_back(each.weight(i));
      if (each.counts != nullptr) append(to.counts, each.counts, each.size);
      if (each.groups != nullptr) append(to.groups, each.groups, each.size);
    }
  }
  whole_columns(whole_columns const& other) : own_(other.own_ ? std::make_shared<vectors>(*other.own_) : nullptr) {}
  whole_columns(whole_columns&&) = default;
  whole_columns& operator=(whole_columns other) noexcept {
    own_.swap(other.own_);
    return *this;
  }
  ~whole_columns() = default;

  void add(weighted_view const& view) {
    vectors& to = own();
    append(to.values, view.values.data(), view.values.size());
    append(to.weights, view.weights.data(), view.weights.size());
    append(to.counts, view.counts.data(), view.counts.size());
    append(to.groups, view.groups.data(), view.groups.size());
  }
  void rescale(double factor) {
    for (double& each : own().weights) each *= factor;
  }

  /// It lasts until something is changed.
  [[nodiscard]] weighted_view view(how_drawn how = how_drawn::independent) const noexcept {
    weighted_view all;
    all.how = how;
    if (!own_) return all;
    all.values = own_->values;
    all.weights = own_->weights;
    all.counts = own_->counts;
    all.groups = own_->groups;
    return all;
  }
  [[nodiscard]] column_parts lent() const {
    column_parts parts;
    if (!own_) return parts;
    own_->lent.store(true, std::memory_order_relaxed);
    parts.share(own_, view());
    return parts;
  }

  template <class Self>
  static auto fields(Self& self) {
    auto& own = self.own();
    return std::tie(own.values, own.weights, own.counts, own.groups);
  }

 private:
  struct vectors {
    std::vector<double> values, weights;
    std::vector<std::uint64_t> counts;
    std::vector<std::uint32_t> groups;
    std::atomic<bool> lent{false};

    vectors() = default;
    vectors(vectors const& other)
        : values(other.values), weights(other.weights), counts(other.counts), groups(other.groups) {}
    vectors& operator=(vectors const&) = delete;
    ~vectors() = default;
  };

  template <class T>
  static void append(std::vector<T>& to, T const* from, std::size_t n) {
    to.insert(to.end(), from, from + n);
  }
  [[nodiscard]] vectors const& own() const {
    static vectors const none;
    return own_ ? *own_ : none;
  }
  [[nodiscard]] vectors& own() {
    if (!own_)
      own_ = std::make_shared<vectors>();
    else if (own_->lent.load(std::memory_order_relaxed))
      own_ = std::make_shared<vectors>(*own_);
    return *own_;
  }

  std::shared_ptr<vectors> own_;  // null: nothing was taken in
};

}  // namespace steelyard::inline v1::detail
