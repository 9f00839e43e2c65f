// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <memory>
#include <tuple>
#include <type_traits>

#include <steelyard/harder/levels.hpp>
#include <steelyard/harder/low_probability_result.hpp>
#include <steelyard/harder/own_moves.hpp>
#include <steelyard/run/pipeline.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// Any state is as likely as any other.
struct no_reading {
  template <class State>
  log_likelihood operator()(State const&) const noexcept {
    return log_likelihood{0.0};
  }
};

template <class Sampler, class Weighter, class Margin, class... Moves>
auto low_probability_of(Sampler const& sampler, Weighter const& weighter, Margin const& margin, tempered_plan const& how,
                        Moves const&... own) {
  static_assert((is_own_move<Moves> && ...), "steelyard: low_probability() takes moves of your own as "
                                             "sy::refresh_together{first, size}");
  static_assert((!is_exact_draw<Moves> && ...), "steelyard: low_probability() takes no exact draws: they would not know of the levels");
  using worker = mover<word_player<Sampler, Weighter, Margin>, Moves...>;
  refuse_plan("low_probability", how);
  ladder_terms terms = terms_of(how, "low_probability");
  terms.own = {block_of(own)...};
  std::tuple<Moves...> const moves(own...);
  executor const execute = how.executor ? how.executor : on_threads(how.threads);
  rung_watch const watch(how);
  worker_pool<worker> pool(
      [&] { return std::make_unique<worker>(terms.run, moves, sampler, weighter, margin, how.on_failure); });
  ladder<worker> on(terms, execute, pool);
  level_climb<worker> levels(on, watch, !std::is_same_v<Weighter, no_reading>);
  on.draw();
  levels.climb(!how.frozen);
  if (how.frozen && levels.reached()) {
    on.begin_again(seed_after_pilot(terms.seed));
    on.draw();
    levels.repeat();
  }
  return result_of_levels(levels, sampler, weighter, how.on_failure);
}

}  // namespace detail

/// The probability that a margin is above zero, however low, from the sampler alone: levels of the margin, each kept by
/// the best plan.level_share of the particles, climbed by chains of the words that the sampler consumes.
///   P = product over levels of the share above it           [Au & Beck, Prob. Eng. Mech. 16, 2001]
///   errors from lineages of the prior draws, and never below what uncorrelated particles would leave
/// @param margin  a readout that returns one finite number: load above the limit, say
/// @param own     blocks of words to be moved together
/// @throws as run_tempered does
/// Assumes  that prior draws, and then each level, see every way up: a way that opens late from a state that no level
/// kept is missed, and nothing can notice. Even margins of many ties are climbed value by value.
/// Cost     chains x length calls for each factor 1/level_share of the probability.
template <class Sampler, class Margin, class... Moves>
auto low_probability(Sampler const& sampler, Margin const& margin, tempered_plan const& how, Moves const&... own) {
  if constexpr (detail::may_draw<true, Sampler>()) {
    using X = state_of_t<Sampler>;
    constexpr bool readable = detail::is_margin<Margin, X>;
    static_assert(readable, "steelyard: low_probability() takes a margin: a readout that returns one number, not bool, and is "
                            "above zero where the event happens");
    if constexpr (readable)
      return detail::low_probability_of(sampler, detail::no_reading{}, margin, how, own...);
    else
      return detail::refused<low_probability_result<X>>();
  } else {
    return detail::refused<estimate>();
  }
}
/// The same given what was read: climbs to the reading first, then from level to level.
template <class Sampler, class Weighter, class Margin, class... Moves>
auto low_probability(pipeline<Sampler, Weighter> const& pipe, Margin const& margin, tempered_plan const& how, Moves const&... own) {
  using X = typename pipeline<Sampler, Weighter>::state_type;
  constexpr bool readable = detail::is_margin<Margin, X>;
  static_assert(readable, "steelyard: low_probability() takes a margin: a readout that returns one number, not bool, and is "
                          "above zero where the event happens");
  if constexpr (readable)
    return detail::low_probability_of(pipe.sampler(), pipe.weighter(), margin, how, own...);
  else
    return detail::refused<low_probability_result<X>>();
}

}  // namespace steelyard::inline v1
