// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/run_facts.hpp>

namespace steelyard::inline v1::detail {

/// Readout columns of a kept sample with their weights, counts and groups, as they were read: in parts that nobody changes,
/// so that merging and answering share them and copy no entry.
class column_parts {
 public:
  /// Column c of a part starts at values + c * size. Without counts or groups their pointers are null.
  struct part {
    std::shared_ptr<void const> owner;
    double const* values;
    double const* weights;
    std::uint64_t const* counts;
    std::uint32_t const* groups;
    std::size_t size;
    double factor;  // on the weights

    [[nodiscard]] double weight(std::size_t i) const noexcept { return weights[i] * factor; }
    [[nodiscard]] double count(std::size_t i) const noexcept { return counts == nullptr ? 1.0 : static_cast<double>(counts[i]); }
  };

  /// Takes in a copy of these entries. @pre view.values.size() is a multiple of view.weights.size()
  void take(weighted_view const& view) {
    struct copied {
      std::unique_ptr<double[]> numbers;
      std::vector<std::uint64_t> counts;
      std::vector<std::uint32_t> groups;
    };
    std::size_t const n = view.weights.size(), of_values = view.values.size();
    auto own = std::make_shared<copied>(copied{std::unique_ptr<double[]>(new double[of_values + n]),
                                               {view.counts.begin(), view.counts.end()},
                                               {view.groups.begin(), view.groups.end()}});
    double* const values = own->numbers.get();
    std::copy_n(view.values.data(), of_values, values);
    std::copy_n(view.weights.data(), n, values + of_values);
    weighted_view copy;
    copy.values = {values, of_values};
    copy.weights = {values + of_values, n};
    copy.counts = own->counts;
    copy.groups = own->groups;
    share(std::move(own), copy);
  }
  /// Takes in entries that `owner` holds and nobody changes any more.
  void share(std::shared_ptr<void const> owner, weighted_view const& view) {
    std::size_t const n = view.weights.size();
    if (n == 0) return;
    parts_.push_back({std::move(owner), view.values.data(), view.weights.data(), view.counts.empty() ? nullptr : view.counts.data(),
                      view.groups.empty() ? nullptr : view.groups.data(), n, 1.0});
    size_ += n;
  }
  void rescale(double factor) {
    for (part& each : parts_) each.factor *= factor;
  }
  column_parts& operator+=(column_parts const& other) {
    parts_.insert(parts_.end(), other.parts_.begin(), other.parts_.end());
    size_ += other.size_;
    return *this;
  }

  [[nodiscard]] std::size_t size() const noexcept { return size_; }
  [[nodiscard]] auto begin() const noexcept { return parts_.begin(); }
  [[nodiscard]] auto end() const noexcept { return parts_.end(); }
  [[nodiscard]] bool counted() const noexcept { return !parts_.empty() && parts_.front().counts != nullptr; }
  [[nodiscard]] bool grouped() const noexcept { return !parts_.empty() && parts_.front().groups != nullptr; }

 private:
  std::vector<part> parts_;
  std::size_t size_ = 0;
};

}  // namespace steelyard::inline v1::detail
