// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// A function that returns a number, with the scale of that number said aloud.
template <class Scale, class F>
class on_scale {
 public:
  explicit on_scale(F f) : f_(std::move(f)) {}

  template <class State>
    requires std::is_convertible_v<std::invoke_result_t<F const&, State const&>, double>
  Scale operator()(State const& state) const {
    return Scale{static_cast<double>(detail::call(f_, state))};
  }
  [[nodiscard]] auto worker_instance() const
    requires per_worker_callable<F>
  {
    auto own = f_.worker_instance();
    return on_scale<Scale, decltype(own)>(std::move(own));
  }

 private:
  F f_;
};

}  // namespace detail

/// Makes a weighter of a function that returns the logarithm of the likelihood.
template <class F>
auto as_log_likelihood(F f) {
  return detail::on_scale<log_likelihood, F>(std::move(f));
}

/// Makes a weighter of a function that returns the likelihood itself.
template <class F>
auto as_likelihood(F f) {
  return detail::on_scale<likelihood, F>(std::move(f));
}

/// Declares that no state's log-likelihood exceeds `log_bound`: sharper limits
/// follow for events that no sample met, and a run that meets a larger score is
/// an error, because then the declaration was wrong.
///   A score above the bound by rounding (1e-12 relative) passes.
/// @throws bad_argument where the bound is not finite.
template <class Weighter>
class bounded {
 public:
  bounded(Weighter weighter, double log_bound) : weighter_(std::move(weighter)), log_bound_(log_bound) {
    if (!detail::is_finite(log_bound)) throw bad_argument("bounded: the bound must be a finite logarithm");
  }

  [[nodiscard]] double log_bound() const noexcept { return log_bound_; }
  [[nodiscard]] std::string_view name() const
    requires detail::named_weighter<Weighter>
  {
    return weighter_.name();
  }

  template <class State>
    requires weighter_for<Weighter, State> && detail::callable_v<Weighter, State const&>
  log_likelihood operator()(State const& state) const {
    double const score = detail::to_log(detail::call(weighter_, state));
    double const size = log_bound_ < 0.0 ? -log_bound_ : log_bound_;
    if (score > log_bound_ + 1e-12 * (1.0 + size))
      throw bad_weight("bounded: a log-likelihood of " + std::to_string(score) + " exceeds the declared bound " +
                       std::to_string(log_bound_));
    return log_likelihood{score};
  }
  [[nodiscard]] auto worker_instance() const
    requires detail::per_worker_callable<Weighter>
  {
    auto own = weighter_.worker_instance();
    return bounded<decltype(own)>(std::move(own), log_bound_);
  }

 private:
  Weighter weighter_;
  double log_bound_;
};

}  // namespace steelyard::inline v1
