// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/harder/climb.hpp>
#include <steelyard/harder/own_moves.hpp>
#include <steelyard/harder/tempered_sample.hpp>
#include <steelyard/run/pipeline.hpp>

namespace steelyard::inline v1 {

/// Draws, weighs and follows a reading too sharp for plain weighting: chains of the words that the sampler consumes
/// climb from the prior to the posterior by rising powers of the likelihood, and the sampler is run on each proposal.
/// Neither its density nor a gradient is asked for.
///   rungs      conditional effective size held at plan.share       [Del Moral, Doucet & Jasra 2006; Zhou, Johansen & Aston 2016]
///   moves      on recorded words, all in balance with the prior    [Kelemen et al. 2002; Cotter, Roberts, Stuart & White 2013]
///   answer     every state of every chain on the last rung         [Dau & Chopin 2022]
///   errors     from lineages of the prior draws                    [Chan & Lai 2013; Lee & Whiteley 2018]
/// Answers a weighted sample of equal weights, each state with how many steps a chain stayed there as its count.
/// @param own  moves of the user's: refresh_together, exact_draw
/// @throws hidden_state  where a draw comes out differently when its words are played again
/// @throws no_likelihood where no prior draw has any likelihood
/// @throws failed_sample, bad_weight, bad_argument, stopped_early as a plain run does
/// Assumes  prior draws that see every mode: a narrow mode that none of them hints at is missed, and nothing can notice.
/// Cost     about two thousand calls and chains x length a rung; memory of 8 bytes for each word of each state on a rung.
template <class Sampler, class Weighter, class... Moves>
  requires(detail::may_draw<false, Sampler>())
auto run_tempered(pipeline<Sampler, Weighter> const& pipe, tempered_plan const& how, Moves const&... own) {
  static_assert((detail::is_own_move<Moves> && ...),
                "steelyard: run_tempered() takes moves of your own as sy::refresh_together{first, size} or "
                "sy::exact_draw(first, size, f)");
  using player = detail::word_player<Sampler, Weighter, detail::no_margin>;
  using worker = detail::mover<player, Moves...>;
  detail::refuse_plan("run_tempered", how);
  detail::ladder_terms terms = detail::terms_of(how, "run_tempered");
  terms.own = {detail::block_of(own)...};
  std::tuple<Moves...> const moves(own...);
  executor const execute = how.executor ? how.executor : on_threads(how.threads);
  detail::rung_watch const watch(how);
  detail::worker_pool<worker> pool([&] {
    return std::make_unique<worker>(terms.run, moves, pipe.sampler(), pipe.weighter(), detail::no_margin{}, how.on_failure);
  });
  detail::ladder<worker> climbing(terms, execute, pool);
  std::vector<detail::rung_settings> record;
  climbing.draw();
  char const* ended = detail::temper(climbing, watch, !how.frozen, record);
  if (how.frozen && ended == nullptr) {
    climbing.begin_again(detail::seed_after_pilot(terms.seed));
    climbing.draw();
    ended = detail::repeat(climbing, watch, record);
  }
  std::vector<finding> findings = detail::findings_of(climbing);
  if (ended != nullptr) findings.push_back(detail::stopped_finding(climbing, ended));
  if (ended != nullptr) climbing.keep_all();
  return detail::sample_of_ladder(climbing, pipe.sampler(), pipe.weighter(), how.on_failure, std::move(findings));
}

/// A pipeline whose sampler was refused says no more here.
template <class Sampler, class Weighter, class... Moves>
  requires(!detail::may_draw<false, Sampler>())
auto run_tempered(pipeline<Sampler, Weighter> const&, tempered_plan const&, Moves const&...) {
  return detail::refused<weighted_sample<detail::no_state>>();
}
template <class Sampler, class Weighter>
auto run_tempered(pipeline<Sampler, Weighter> const& pipe) {
  return run_tempered(pipe, tempered_plan{});
}

}  // namespace steelyard::inline v1
