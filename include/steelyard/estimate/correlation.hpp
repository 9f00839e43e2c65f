// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cmath>
#include <cstddef>
#include <span>
#include <tuple>
#include <utility>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/moment_sums.hpp>

namespace steelyard::inline v1 {

/// A correlation between -1 and 1. Its error interval is symmetric in atanh r   [Fisher, Metron 1, 1921].
class correlation_result : public estimate {
 public:
  correlation_result() = default;
  explicit correlation_result(estimate const& r) : estimate(r) {}

  /// Where the exact correlation lies, given Monte Carlo error; never outside [-1, 1].
  /// @throws bad_argument for a level outside (0, 1).
  interval error_interval(double level) const {
    interval const linear = estimate::error_interval(level);
    double const slope = 1.0 - value * value;
    if (!linear.lower_known || !(slope > 0.0)) return {-1.0, 1.0, linear.lower_known, linear.upper_known};
    double const reach = 2.0 * ((linear.upper - value) / slope);
    double const odds = (1.0 + value) / (1.0 - value), factor = detail::portable_exp(reach);
    auto const back = [](double o) { return o < 1.0 ? (o - 1.0) / (o + 1.0) : (1.0 - 1.0 / o) / (1.0 + 1.0 / o); };
    return {back(odds / factor), back(odds * factor), true, true};
  }
};

namespace detail {

/// Correlation from centred sums; value 0 and `broken` where a column does not vary.
template <std::size_t P>
correlation_result correlation_of(moment_sums<2, 2, P> const& all, run_facts const& facts, std::size_t set = 0) {
  double const xx = all.moment(2, 0, set), yy = all.moment(0, 2, set), xy = all.moment(1, 1, set);
  if (!(xx > 0.0) || !(yy > 0.0)) return correlation_result(estimate(0.0, {}, facts));
  double const root = std::sqrt(xx) * std::sqrt(yy), r = std::max(-1.0, std::min(1.0, xy / root));
  typename moment_sums<2, 2, P>::polynomial q{};
  q[all.place(1, 1)] = 1.0 / root;
  q[all.place(2, 0)] = -0.5 * r / xx;
  q[all.place(0, 2)] = -0.5 * r / yy;
  return correlation_result(estimate(r, all.terms(q, facts, set), facts));
}

}  // namespace detail

/// Correlation of two readouts.
///   r = sum W zx zy,  u = W (zx zy - r (zx^2 + zy^2) / 2), z standardised               [delta method]
/// Where a readout does not vary, the value is 0 and `broken`: it is not defined.
/// Assumes finite fourth moments.
template <class First, class Second>
class correlation_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 2;

  correlation_estimator(First first, Second second) : readouts_(std::move(first), std::move(second)) {}

  [[nodiscard]] std::tuple<First, Second> const& readout() const noexcept { return readouts_; }
  [[nodiscard]] correlation_estimator fresh() const { return {std::get<0>(readouts_), std::get<1>(readouts_)}; }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    sums_.add(view, [&](std::size_t) { return std::array{values.data(), values.data() + weights.size()}; });
  }
  void rescale(double factor) { sums_.rescale(factor); }
  correlation_estimator& operator+=(correlation_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] correlation_result answer(run_facts const& facts) const {
    return detail::correlation_of(sums_.centred(), facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::moment_sums<2, 2>::fields(self.sums_);
  }

 private:
  std::tuple<First, Second> readouts_;
  detail::moment_sums<2, 2> sums_;
};

/// Correlation of two scalar readouts.
template <class First, class Second>
[[nodiscard]] auto correlation(First first, Second second) {
  return correlation_estimator<First, Second>(std::move(first), std::move(second));
}

}  // namespace steelyard::inline v1
