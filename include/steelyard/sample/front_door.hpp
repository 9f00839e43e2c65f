// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <type_traits>
#include <utility>

#include <steelyard/estimate/answers.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/weigh/front_door.hpp>

namespace steelyard::inline v1::detail {

/// As many answers as there are questions, where one of them is refused.
template <class... Es>
using refused_answers = answers<std::conditional_t<std::is_void_v<Es>, void, estimate>...>;

/// Whether E can be asked of states of type X. With `Speak`, one sentence says
/// what is wrong, and nothing behind it is instantiated.
template <bool Speak, class E, class X, bool OnePass>
consteval bool may_ask() {
  if constexpr (!estimator<E>) {
    static_assert(!Speak || estimator<E>,
                  "steelyard: this is not an estimator: ask expectation(f), probability(f), ... or write one with "
                  "readout, fresh, add, rescale, +=, value and fields");
    return false;
  } else if constexpr (std::is_same_v<X, no_state>) {
    return false;
  } else if constexpr (!reads_v<E, X>) {
    static_assert(!Speak || reads_v<E, X>,
                  "steelyard: this readout cannot read this state: it is called as const with one state and returns "
                  "a number or a std::array of numbers");
    return false;
  } else if constexpr (OnePass && takes_everything<E>) {
    static_assert(!Speak || !takes_everything<E>,
                  "steelyard: this question needs all values at once: keep the sample with run() and ask it there");
    return false;
  } else if constexpr (OnePass && !are_plain_fields_v<decltype(E::fields(std::declval<E&>()))>) {
    static_assert(!Speak, "steelyard: fields() of this estimator may name numbers, and std::arrays and std::vectors of them, "
                          "as std::tie(...): a run writes them to its checkpoints");
    return false;
  } else if constexpr (requires { E::asks_an_event; }) {
    constexpr bool event = event_for<std::remove_cvref_t<decltype(std::declval<E const&>().readout())>, X>;
    static_assert(!Speak || event, "steelyard: probability() takes an event: a readout that returns bool");
    return event;
  } else if constexpr (requires { E::columns; }) {
    constexpr bool scalar = columns_of<readouts_t<E>, X>::size == E::columns;
    static_assert(!Speak || scalar, "steelyard: this question takes readouts that return one number each");
    return scalar;
  } else {
    return true;
  }
}

}  // namespace steelyard::inline v1::detail
