// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <type_traits>
#include <utility>

#include <steelyard/base/error.hpp>
#include <steelyard/weigh/adapt.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/together.hpp>

namespace steelyard::inline v1::detail {

/// Stands in for the state where a sampler is refused: nothing is said of it a second time.
struct no_state {};

/// What a refused call would return: so that its caller's next line is no second error.
template <class Answer>
[[noreturn]] Answer refused() {
  throw error("steelyard: this call was refused by the compiler");
}

/// The weighter to blame where W cannot weigh a state: W itself without what wraps it, or the first part of
/// `together` that cannot.
template <class W, class X>
struct to_blame {
  using type = W;
};
template <class W, class X>
struct to_blame<named<W>, X> : to_blame<W, X> {};
template <class W, class X>
struct to_blame<bounded<W>, X> : to_blame<W, X> {};
template <class W, class X>
struct to_blame<together<W>, X> : to_blame<W, X> {};
template <class W, class Next, class... Rest, class X>
struct to_blame<together<W, Next, Rest...>, X>
    : std::conditional_t<weighter_for<W, X>, to_blame<together<Next, Rest...>, X>, to_blame<W, X>> {};

/// A weighter that reads the state somewhere, and cannot read this one.
template <class W, class X>
inline constexpr bool reads_elsewhere_v = false;
template <class W, class X>
  requires requires(W const& weighter) { weighter.readout(); }
inline constexpr bool reads_elsewhere_v<W, X> =
    !callable_v<std::remove_cvref_t<decltype(std::declval<W const&>().readout())>, X const&>;

/// A reading whose instrument takes another true value than the readout finds.
template <class W, class X>
inline constexpr bool scores_nothing_v = false;
template <class W, class X>
  requires requires(W const& weighter) {
    weighter.readout();
    W::template scores_state<X>;
  }
inline constexpr bool scores_nothing_v<W, X> = !reads_elsewhere_v<W, X> && !W::template scores_state<X>;

/// Whether a weighter weighs states of type X. With `Speak`, one sentence says
/// what is wrong.
template <bool Speak, class Weighter, class X>
consteval bool may_weigh() {
  if constexpr (weighter_for<Weighter, X>) {
    return true;
  } else if constexpr (std::is_same_v<X, no_state>) {
    return false;
  } else {
    using W = typename to_blame<Weighter, X>::type;
    constexpr bool bare = std::is_convertible_v<result_t<W, X const&>, double>;
    constexpr bool changes = only_mutable_v<W, X const&>;
    constexpr bool elsewhere = reads_elsewhere_v<W, X>, nothing = scores_nothing_v<W, X>, made = !makes_nothing_v<W>;
    static_assert(!Speak || !bare, "steelyard: this weighter returns a bare number, which could be a density or its "
                                   "logarithm: return sy::log_likelihood{...} or sy::likelihood{...}, or wrap it as "
                                   "sy::as_log_likelihood(f) or sy::as_likelihood(f)");
    static_assert(!Speak || !changes, "steelyard: this weighter changes itself when called; weighters are called as const, "
                                      "perhaps from several threads: wrap it as sy::per_worker([] { return weighter; })");
    static_assert(!Speak || !elsewhere, "steelyard: the readout of this reading cannot read this state");
    static_assert(!Speak || !nothing, "steelyard: a reading's instrument cannot score its value against what its readout "
                                      "returns; see the instrument's documentation for the true value it takes");
    static_assert(!Speak || made, "steelyard: per_worker() takes a factory without arguments that returns the callable: "
                                  "sy::per_worker([] { return weighter; })");
    static_assert(!Speak || bare || changes || elsewhere || nothing || !made,
                  "steelyard: this weighter cannot weigh these states: it is called as const with one state and returns "
                  "log_likelihood or likelihood");
    return false;
  }
}

}  // namespace steelyard::inline v1::detail
