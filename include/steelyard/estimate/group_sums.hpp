// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>

namespace steelyard::inline v1::detail {

/// N sums for each group label, kept sorted by label.
template <std::size_t N>
class group_sums {
 public:
  using sums = std::array<double, N>;

  [[nodiscard]] bool empty() const noexcept { return labels_.empty(); }
  [[nodiscard]] std::size_t size() const noexcept { return labels_.size(); }
  [[nodiscard]] sums const& operator[](std::size_t g) const noexcept { return sums_[g]; }
  [[nodiscard]] std::uint32_t label(std::size_t g) const noexcept { return labels_[g]; }

  /// Collects terms in any order; call `settle()` before reading.
  void push(std::uint32_t label, sums const& terms) {
    labels_.push_back(label);
    sums_.push_back(terms);
  }

  /// Sorts by label, stably, and adds up what shares one.
  void settle() {
    bool sorted = true;
    for (std::size_t i = 1; i < labels_.size(); ++i) sorted = sorted && labels_[i - 1] < labels_[i];
    if (sorted) return;
    std::vector<std::size_t> order(labels_.size());
    for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return labels_[a] < labels_[b]; });
    group_sums merged;
    for (std::size_t const i : order) merged.join(labels_[i], sums_[i]);
    *this = std::move(merged);
  }

  template <class Change>
  void for_each(Change change) {
    for (sums& each : sums_) change(each);
  }

  /// Both settled: groups of one label add up.
  group_sums& operator+=(group_sums const& other) {
    if (other.empty()) return *this;
    if (empty()) return *this = other;
    group_sums merged;
    std::size_t a = 0, b = 0;
    while (a < size() || b < other.size()) {
      bool const left = b == other.size() || (a < size() && labels_[a] <= other.labels_[b]);
      if (left) {
        merged.join(labels_[a], sums_[a]);
        ++a;
      } else {
        merged.join(other.labels_[b], other.sums_[b]);
        ++b;
      }
    }
    return *this = std::move(merged);
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.labels_, self.sums_);
  }

 private:
  void join(std::uint32_t label, sums const& terms) {
    if (!labels_.empty() && labels_.back() == label)
      for (std::size_t k = 0; k < N; ++k) sums_.back()[k] += terms[k];
    else
      push(label, terms);
  }

  std::vector<std::uint32_t> labels_;
  std::vector<sums> sums_;
};

}  // namespace steelyard::inline v1::detail
