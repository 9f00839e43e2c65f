// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/mean_sums.hpp>

namespace steelyard::inline v1 {

/// Difference of two expectations on one sample, E f - E g: what the two errors
/// share cancels.
///   u = W ((f - g) - mean)
template <class First, class Second>
class difference_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 2;

  difference_estimator(First first, Second second) : readouts_(std::move(first), std::move(second)) {}

  [[nodiscard]] std::tuple<First, Second> const& readout() const noexcept { return readouts_; }
  [[nodiscard]] difference_estimator fresh() const { return {std::get<0>(readouts_), std::get<1>(readouts_)}; }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    std::size_t const n = weights.size();
    std::vector<double> gap(n);
    for (std::size_t i = 0; i < n; ++i) gap[i] = values[i] - values[n + i];
    weighted_view of_gap = view;
    of_gap.values = gap;
    sums_.add(of_gap);
  }
  void rescale(double factor) { sums_.rescale(factor); }
  difference_estimator& operator+=(difference_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] estimate answer(run_facts const& facts) const {
    return estimate(sums_.mean()[0], sums_.terms(0, facts), facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::mean_sums<1>::fields(self.sums_);
  }

 private:
  std::tuple<First, Second> readouts_;
  detail::mean_sums<1> sums_;
};

/// Difference of the expectations of two scalar readouts.
template <class First, class Second>
[[nodiscard]] auto difference(First first, Second second) {
  return difference_estimator<First, Second>(std::move(first), std::move(second));
}

}  // namespace steelyard::inline v1
