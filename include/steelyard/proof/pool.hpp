// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/proof/uniformity.hpp>
#include <steelyard/weigh/itemised.hpp>

// The two ends of a calibration check: one truth among its draws, and which readings fare worst.

namespace steelyard::inline v1::proof::detail {

/// Position of the truth in its pool: (sum of w below + V (w_truth + w tied)) / (sum w + w_truth).
///   logs  log-weights of the draws, any common constant left out; `impossible` weighs nothing
/// Uniform at every size where the truth comes from the same law as the draws: any member of the pool could be it,
/// with probability proportional to its weight.
/// @pre  the truth has positive weight, 0 < v < 1
inline double pool_position(std::vector<double> logs, std::span<double const> values, double truth_log, double truth,
                            double v) {
  logs.push_back(truth_log);
  std::vector<double> weights(logs.size());
  up::weights_from_logs(logs, up::block_maximum(logs), weights);
  double below = 0.0, tied = weights.back(), total = weights.back();
  for (std::size_t i = 0; i < values.size(); ++i) {
    total += weights[i];
    if (values[i] < truth) below += weights[i];
    if (values[i] == truth) tied += weights[i];
  }
  double const position = (below + v * tied) / total;
  return position < 1.0 ? position : 1.0;
}

/// The readings of a calibration check, as far as they are numbers.
class reading_log {
 public:
  explicit reading_log(std::size_t repeats) : numbers_(repeats) {}

  template <class Reading>
  void set(std::size_t repeat, Reading const& reading) {
    if constexpr (std::is_convertible_v<Reading const&, double>) numbers_[repeat] = static_cast<double>(reading);
  }
  template <class Reading>
  static constexpr bool tells = std::is_convertible_v<Reading const&, double>;

  /// Of up to five ranges of the readings with equally many repeats, the one whose positions are furthest off.
  [[nodiscard]] std::string worst(std::span<double const> positions) const {
    std::size_t const n = positions.size(), ranges = std::min<std::size_t>(5, n / 20);
    std::vector<std::size_t> order(n);
    for (std::size_t r = 0; r < n; ++r) order[r] = r;
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return numbers_[a] < numbers_[b]; });
    double furthest = -1.0;
    std::string text;
    for (std::size_t k = 0; k < ranges; ++k) {
      std::size_t const first = k * n / ranges, last = (k + 1) * n / ranges;
      std::vector<double> some;
      for (std::size_t i = first; i < last; ++i) some.push_back(positions[order[i]]);
      tendency const is(some);
      if (!(is.largest() > furthest)) continue;
      furthest = is.largest();
      text = "worst for readings from " + up::short_number(numbers_[order[first]]) + " to " +
             up::short_number(numbers_[order[last - 1]]) + ", where positions average " + up::short_number(is.mean) +
             " with a spread of " + up::short_number(is.spread) + " of the right one";
    }
    return text;
  }

 private:
  std::vector<double> numbers_;
};

/// Three repeats whose truth lies nearest to an end of its draws: for readings that are no numbers.
inline std::string worst_repeats(std::span<double const> positions) {
  std::vector<std::size_t> order(positions.size());
  for (std::size_t r = 0; r < order.size(); ++r) order[r] = r;
  auto const edge = [&](std::size_t r) { return std::min(positions[r], 1.0 - positions[r]); };
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return edge(a) < edge(b); });
  std::string text = "worst in repeats ";
  for (std::size_t k = 0; k < 3; ++k)
    text +=
        (k > 0 ? ", " : "") + std::to_string(order[k]) + " (position " + up::short_number(positions[order[k]]) + ")";
  return text;
}

}  // namespace steelyard::inline v1::proof::detail
