// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <span>
#include <string>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/estimates.hpp>
#include <steelyard/estimate/estimator.hpp>

namespace steelyard::inline v1 {

/// A target for the standard error as a share of the value's size.
struct relative {
  double share;
  explicit relative(double of_value) : share(of_value) {}
};

/// An estimator with a target for its standard error: a one-pass run that asks
/// it stops at the first round where every target is met.
///   met: standard error <= target, and at least 30 carriers (from few groups: verdict `sound`)
/// Rounds are 1024 samples and then double, up to the plan's size. On a kept sample it answers like the
/// estimator it wraps.
template <class E>
class until_estimator : public E {
 public:
  until_estimator(E question, double absolute, double of_value)
      : E(std::move(question)), absolute_(absolute), of_value_(of_value) {}

  [[nodiscard]] until_estimator fresh() const { return {E::fresh(), absolute_, of_value_}; }
  until_estimator& operator+=(until_estimator const& other) {
    E::operator+=(other);
    return *this;
  }
  template <class State>
  [[nodiscard]] auto for_state() const {
    auto bound = detail::for_state<State>(static_cast<E const&>(*this));
    return until_estimator<decltype(bound)>(std::move(bound), absolute_, of_value_);
  }

  [[nodiscard]] bool met(estimate const& e) const {
    double const size = e.value < 0.0 ? -e.value : e.value;
    bool const enough = e.groups() > 0.0 ? e.verdict() == verdict::sound : e.carriers >= 30.0;
    return enough && e.standard_error <= absolute_ + of_value_ * size;
  }
  template <std::size_t N>
  [[nodiscard]] bool met(estimates<N> const& all) const {
    for (estimate const& each : all)
      if (!met(each)) return false;
    return true;
  }

 private:
  double absolute_;
  double of_value_;
};

/// Draw until the standard error is at most `target`, in the readout's unit.
/// @throws bad_argument unless the target is a positive finite number.
template <class E>
[[nodiscard]] auto until(E question, double target) {
  if (!detail::is_finite(target) || !(target > 0.0))
    throw bad_argument("until: the target " + detail::plain_number(target) + " must be a positive finite number");
  return until_estimator<E>(std::move(question), target, 0.0);
}
/// Draw until the standard error is at most this share of the value's size.
/// @throws bad_argument unless the share is a positive finite number.
template <class E>
[[nodiscard]] auto until(E question, relative target) {
  if (!detail::is_finite(target.share) || !(target.share > 0.0))
    throw bad_argument("until: the relative target " + detail::plain_number(target.share) +
                       " must be a positive finite number");
  return until_estimator<E>(std::move(question), 0.0, target.share);
}

namespace detail {

template <class E>
struct is_until {
  static constexpr bool value = false;
};
template <class E>
struct is_until<until_estimator<E>> {
  static constexpr bool value = true;
};

}  // namespace detail

}  // namespace steelyard::inline v1
