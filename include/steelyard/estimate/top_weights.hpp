// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

/// The largest log-weights seen, up to 257 of them: what the tail index is
/// fitted to. Which ones stay does not depend on the order they come or merge in.
/// Cost  a comparison a weight, or one a block of weights that are all too small.
class top_weights {
 public:
  static constexpr std::size_t most = 257;

  /// In rising order, at most `most`.
  [[nodiscard]] std::vector<double> sorted() const {
    top_weights last = *this;
    last.shrink(most);
    std::sort(last.logs_.begin(), last.logs_.end());
    return std::move(last.logs_);
  }

  /// Takes in a block, each entry as often as it counts, and returns what of it may be among the largest of all.
  /// @param maximum  the largest of the block
  top_weights take(std::span<double const> log_weights, std::span<std::uint64_t const> counts, double maximum) {
    top_weights of_block;
    if (!(maximum > floor_)) return of_block;
    for (std::size_t i = 0; i < log_weights.size(); ++i) {
      double const log_weight = log_weights[i];
      if (!(log_weight > floor_)) continue;
      std::uint64_t const copies = counts.empty() ? 1 : std::min<std::uint64_t>(counts[i], most);
      for (std::uint64_t c = 0; c < copies; ++c) {
        of_block.logs_.push_back(log_weight);
        logs_.push_back(log_weight);
        if (logs_.size() >= 2 * most) shrink(most);
      }
    }
    of_block.shrink(2 * most);
    return of_block;
  }
  top_weights& operator+=(top_weights const& other) {
    logs_.insert(logs_.end(), other.logs_.begin(), other.logs_.end());
    shrink(2 * most);
    return *this;
  }

  template <class Self>
  static auto& fields(Self& self) {
    return self.logs_;
  }

 private:
  /// Where there are more than `limit`, only the largest stay.
  void shrink(std::size_t limit) {
    if (logs_.size() <= limit) return;
    auto const last = logs_.begin() + (most - 1);
    std::nth_element(logs_.begin(), last, logs_.end(), [](double a, double b) { return a > b; });
    floor_ = *last;
    logs_.resize(most);
  }

  std::vector<double> logs_;
  double floor_ = impossible;  // what is not above it is not among the largest
};

}  // namespace steelyard::inline v1::detail
