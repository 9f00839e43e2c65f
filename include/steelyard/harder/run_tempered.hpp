// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/harder/ladder.hpp>
#include <steelyard/harder/tempered_plan.hpp>
#include <steelyard/run/pipeline.hpp>
#include <steelyard/run/threads.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// What the last rung left, as a weighted sample: states with counts, lineages as groups.
template <class Player, class Weighter>
weighted_sample<typename Player::state> tempered_sample(ladder<Player>& climbed, Weighter const& weighter, executor execute,
                                                        std::uint64_t seed, std::vector<finding> findings) {
  using X = typename Player::state;
  auto origin = std::make_shared<sample_origin>();
  origin->seed = seed;
  origin->execute = std::move(execute);
  origin->how = how_drawn::lineages;
  origin->calls = climbed.calls();
  sample_columns columns;
  for (std::size_t k = 0; k < Player::items; ++k) columns.names.push_back(item_name(weighter, k));
  columns.scores.resize(Player::items);
  state_array<X> states;
  std::vector<std::uint32_t> lineages;
  for (auto& t : climbed.trails())
    for (std::size_t v = 0; v < t.visits.size(); ++v) {
      if (t.visits[v].steps == 0) continue;
      states.emplace_back(std::move(t.states[v]));
      for (std::size_t k = 0; k < Player::items; ++k) columns.scores[k].push_back(t.scores[v * Player::items + k]);
      columns.base.push_back(-t.visits[v].seen.log_likelihood);
      origin->counts.push_back(t.visits[v].steps);
      origin->drawn += t.visits[v].steps;
      lineages.push_back(t.lineage);
    }
  columns.log_weights.assign(lineages.size(), 0.0);
  columns.log_base = climbed.log_evidence();
  columns.base_known = true;
  origin->take_labels(lineages);
  auto influence = std::make_shared<base_influence>();
  std::vector<std::uint32_t> alive = lineages;
  std::sort(alive.begin(), alive.end());
  alive.erase(std::unique(alive.begin(), alive.end()), alive.end());
  std::size_t next = 0;
  for (std::size_t e = 0; e < climbed.influence().size(); ++e) {
    double const d = climbed.influence()[e], square = d * d;
    if (next < alive.size() && alive[next] == e) {
      influence->of_group.push_back(d);
      ++next;
    } else {
      influence->rest_squares += square;
      influence->rest_fourth += square * square;
      influence->rest_largest = std::max(influence->rest_largest, square);
    }
  }
  origin->influence = std::move(influence);
  origin->findings = std::move(findings);
  return weighted_sample<X>(std::make_shared<kept_states<X, state_array<X>>>(std::move(states)), std::move(columns),
                            std::move(origin), "run_tempered");
}

}  // namespace detail

template <class Sampler, class Weighter>
auto run_tempered(pipeline<Sampler, Weighter> const& pipe, tempered_plan const& how = {}) {
  using player = detail::word_player<Sampler, Weighter, detail::no_margin>;
  using worker = detail::mover<player>;
  detail::ladder_terms terms;
  terms.seed = how.seed;
  terms.chains = static_cast<std::size_t>(how.chains.value());
  terms.draws = how.draws == 0u ? std::max<std::size_t>(2000, 10 * terms.chains) : static_cast<std::size_t>(how.draws.value());
  terms.shortest = how.shortest;
  terms.longest = how.longest;
  terms.share = how.share;
  executor const execute = how.executor ? how.executor : on_threads(how.threads);
  detail::worker_pool<worker> pool([&] {
    return std::make_unique<worker>(terms.seed, terms.run, pipe.sampler(), pipe.weighter(), detail::no_margin{}, terms.seed,
                                    how.on_failure);
  });
  detail::ladder<player> climbing(terms, execute, pool);
  climbing.draw();
  while (climbing.target().power < 1.0) {
    double const most = 1.0 - climbing.target().power;
    double const step = detail::longest_step(climbing.log_likelihoods(), climbing.counts(), most, terms.share);
    bool const last = !(step < most);
    climbing.climb({last ? 1.0 : climbing.target().power + step}, last);
  }
  return detail::tempered_sample(climbing, pipe.weighter(), execute, terms.seed, {});
}

}  // namespace steelyard::inline v1
