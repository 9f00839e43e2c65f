// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/base/lanes.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1::detail {

template <class W>
concept named_weighter = requires(W const& weighter) {
  { weighter.name() } -> std::convertible_to<std::string_view>;
};
template <class W>
concept bounded_weighter = requires(W const& weighter) {
  { weighter.log_bound() } -> std::convertible_to<double>;
};
template <class W>
inline constexpr bool has_items_v = requires(W const& weighter, std::size_t i) {
  { std::bool_constant<(W::size > 0)>{} } -> std::same_as<std::true_type>;
  { weighter.name(i) } -> std::convertible_to<std::string_view>;
};

template <class W>
constexpr std::size_t item_count() noexcept {
  if constexpr (has_items_v<W>)
    return W::size;
  else
    return 1;
}

/// Name of column i; a weighter without a name has one column called "likelihood".
template <class W>
std::string item_name(W const& weighter, std::size_t i) {
  if constexpr (has_items_v<W>)
    return std::string(std::string_view(weighter.name(i)));
  else if constexpr (named_weighter<W>)
    return std::string(std::string_view(weighter.name()));
  else
    return "likelihood";
}

/// A score as it is stored: finite, or `impossible` for minus infinity.
/// @throws bad_weight for plus infinity and NaN.
inline double checked_log(double value) {
  if (is_finite(value)) return value;
  if (is_minus_infinite(value)) return impossible;
  throw bad_weight(is_nan(value) ? "its log-likelihood is not a number (NaN)" : "its log-likelihood is plus infinity");
}
inline double to_log(log_likelihood score) { return checked_log(score.value); }
inline double to_log(likelihood score) {
  if (!is_finite(score.value))
    throw bad_weight(is_nan(score.value) ? "its likelihood is not a number (NaN)" : "its likelihood is infinite");
  if (score.value < 0.0) throw bad_weight("its likelihood is negative (" + std::to_string(score.value) + ")");
  return score.value == 0.0 ? impossible : portable_log(score.value);
}

/// Every score of one state, checked; `out` has one place for each item.
template <class Instance, class State>
void score_items(Instance const& weighter, State const& state, std::span<double> out) {
  if constexpr (requires { weighter.scores(state, out); }) {
    weighter.scores(state, out);
    for (double& score : out) score = checked_log(score);
  } else if constexpr (requires { to_log(detail::call(weighter, state)); }) {  // else a front door has spoken
    out[0] = to_log(detail::call(weighter, state));
  }
}

/// Sum of a base log-weight and the scores; impossible if any of them is.
inline double total_log(double base, std::span<double const> scores) {
  double total = base;
  bool possible = base > impossible;
  for (double const score : scores) {
    possible = possible && score > impossible;
    total += score;
  }
  if (!possible) return impossible;
  if (!is_finite(total)) throw bad_weight("its log-likelihoods add up beyond the range of a double");
  return total;
}

}  // namespace steelyard::inline v1::detail
