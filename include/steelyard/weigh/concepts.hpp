// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <concepts>
#include <cstddef>
#include <optional>
#include <span>
#include <string_view>
#include <tuple>
#include <type_traits>
#include <utility>

#include <steelyard/draw/draws.hpp>
#include <steelyard/weigh/callable.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

namespace detail {

template <class T>
struct unwrap_optional {
  using type = T;
  static constexpr bool may_be_empty = false;
};
template <class T>
struct unwrap_optional<std::optional<T>> {
  using type = T;
  static constexpr bool may_be_empty = true;
};

template <class T>
inline constexpr bool is_number_v = std::is_arithmetic_v<T>;

}  // namespace detail

/// How many columns a readout's answer fills; 0: no readout may return it.
/// Specialise for other arrays of fixed length, with a static
/// `write(answer, double* first, std::size_t stride)`.
template <class Answer>
struct readout_columns {
  static constexpr std::size_t size = 0;
};
template <class T>
  requires(detail::is_number_v<T>)
struct readout_columns<T> {
  static constexpr std::size_t size = 1;
  static void write(T answer, double* first, std::size_t) noexcept { *first = static_cast<double>(answer); }
};
template <class T, std::size_t N>
  requires(detail::is_number_v<T>)
struct readout_columns<std::array<T, N>> {
  static constexpr std::size_t size = N;
  static void write(std::array<T, N> const& answer, double* first, std::size_t stride) noexcept {
    for (std::size_t k = 0; k < N; ++k) first[k * stride] = static_cast<double>(answer[k]);
  }
};

/// The state a sampler makes: what it returns, or what its `std::optional` holds.
template <class Sampler>
using state_of_t = typename detail::unwrap_optional<detail::result_t<Sampler, draws&>>::type;

namespace detail {

/// Whether a state can be made of what a sampler returns; what it returns by reference is copied.
template <class F, class Drawn = std::invoke_result_t<called_t<F>, draws&>>
consteval bool hands_over() {
  if constexpr (unwrap_optional<std::remove_cvref_t<Drawn>>::may_be_empty)
    return std::is_constructible_v<state_of_t<F>, decltype(*std::declval<Drawn>())>;
  else
    return std::is_constructible_v<state_of_t<F>, Drawn>;
}

}  // namespace detail

/// The user's generator: called as `const` with `draws&`, returns a movable
/// state, or `std::optional` of one where a run may fail.
template <class F>
concept sampler = detail::callable_v<F, draws&> && !std::is_void_v<state_of_t<F>> &&
                  std::move_constructible<state_of_t<F>> && detail::hands_over<F>();

/// A weighter of several named readings: `size`, `name(i)` and
/// `scores(state, span)` with one log-likelihood each.
template <class W, class State>
concept itemised_weighter_for =
    requires(std::remove_reference_t<detail::instance_t<W>> const& weighter, W const& named, State const& state,
             std::span<double> out, std::size_t i) {
      { std::bool_constant<(W::size > 0)>{} } -> std::same_as<std::true_type>;
      { named.name(i) } -> std::convertible_to<std::string_view>;
      weighter.scores(state, out);
    };

/// The user's likelihood: called as `const` with a state, returns
/// `log_likelihood` or `likelihood` (never a bare number), or is itemised.
template <class W, class State>
concept weighter_for = std::same_as<detail::result_t<W, State const&>, log_likelihood> ||
                       std::same_as<detail::result_t<W, State const&>, likelihood> || itemised_weighter_for<W, State>;

/// From a state to a number or a fixed array of numbers, by `std::invoke`.
template <class R, class State>
concept readout_for = (readout_columns<detail::result_t<R, State const&>>::size > 0);

/// A readout that returns `bool`.
template <class R, class State>
concept event_for = std::same_as<detail::result_t<R, State const&>, bool>;

}  // namespace steelyard::inline v1
