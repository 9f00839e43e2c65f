// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <cstddef>
#include <span>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1 {

namespace detail {

template <class T>
struct as_readout_tuple {
  using type = std::tuple<T>;
};
template <class... Ts>
struct as_readout_tuple<std::tuple<Ts...>> {
  using type = std::tuple<Ts...>;
};

/// The estimator's readouts as a tuple type, one or several.
template <class E>
using readouts_t =
    typename as_readout_tuple<std::remove_cvref_t<decltype(std::declval<E const&>().readout())>>::type;

template <class E>
concept states_its_error = requires { requires E::own_error; };
template <class E>
concept takes_everything = requires { requires E::needs_all; };
template <class E>
concept takes_zeros = requires { requires E::takes_zero_weights; };
template <class E>
concept takes_any_number = requires { requires E::takes_not_finite; };
template <class E>
concept prepares = requires(E& e, std::span<double const> s) { e.prepare(s, s); };

template <class E>
concept accumulates = requires(E& e, E const& c, double factor) {
  c.readout();
  { c.fresh() } -> std::same_as<E>;
  e.rescale(factor);
  e += c;
  E::fields(e);
};

}  // namespace detail

/// A mergeable accumulator with an answer, fed with blocks:
///   readout()               one readout, or a std::tuple of several
///   fresh()                 an empty accumulator of the same kind, prepared alike
///   add(values, weights)    values one column after another, weights relative to a running maximum
///   rescale(factor)         all weights so far times the factor
///   operator+=              takes in what another one accumulated
///   value()                 the answer as a number
///   fields(self)            std::tie of what it accumulates
/// Optional: prepare(values, weights), once, before any add, with the first 4096 entries of positive weight.
/// With `static constexpr bool own_error = true` it brings its own error bar:
///   add(values, weights, weighted_view) and answer(run_facts) instead of add and value().
/// `needs_all` (kept samples only): one add with every entry. `takes_not_finite`: NaN and infinite readouts are
/// handed on instead of refused. `takes_zero_weights` (without readouts): entries of weight zero are handed on.
template <class E>
concept estimator =
    detail::accumulates<E> &&
    ((detail::states_its_error<E> &&
      requires(E& e, E const& c, std::span<double const> s, weighted_view const& view, run_facts const& facts) {
        e.add(s, s, view);
        c.answer(facts);
      }) ||
     (!detail::states_its_error<E> && requires(E& e, E const& c, std::span<double const> s) {
       e.add(s, s);
       { c.value() } -> std::convertible_to<double>;
     }));

namespace detail {

template <class Readouts, class State>
struct columns_of;
template <class... Rs, class State>
struct columns_of<std::tuple<Rs...>, State> {
  static constexpr bool valid = (readout_for<Rs, State> && ...);
  static constexpr std::size_t size = (readout_columns<result_t<Rs, State const&>>::size + ... + 0);
};

/// True where every readout of the estimator can read this kind of state.
template <class E, class State>
inline constexpr bool reads_v = columns_of<readouts_t<E>, State>::valid;

template <class Field>
inline constexpr bool is_plain_field_v = std::is_trivially_copyable_v<Field>;
template <class T>
inline constexpr bool is_plain_field_v<std::vector<T>> = std::is_trivially_copyable_v<T>;
template <class Fields>
inline constexpr bool are_plain_fields_v = false;
template <class... Fields>
inline constexpr bool are_plain_fields_v<std::tuple<Fields&...>> = (is_plain_field_v<Fields> && ...);

/// The estimator as the engine runs it on this kind of state: some learn here
/// how many columns their readout has.
template <class State, class E>
auto for_state(E const& e) {
  if constexpr (requires { e.template for_state<State>(); })
    return e.template for_state<State>();
  else
    return e;
}
template <class E, class State>
using bound_t = decltype(for_state<State>(std::declval<E const&>()));

}  // namespace detail

}  // namespace steelyard::inline v1
