// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/harder/ladder.hpp>
#include <steelyard/harder/tempered_plan.hpp>
#include <steelyard/harder/word_store.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1::detail {

/// The influence of lineages on the log-evidence, those that live by their rank.
/// @param labels  of the states
inline std::shared_ptr<base_influence const> influence_of(std::vector<double> const& all, std::vector<std::uint32_t> labels) {
  std::sort(labels.begin(), labels.end());
  labels.erase(std::unique(labels.begin(), labels.end()), labels.end());
  auto split = std::make_shared<base_influence>();
  std::size_t next = 0;
  for (std::size_t e = 0; e < all.size(); ++e) {
    double const square = all[e] * all[e];
    if (next < labels.size() && labels[next] == e) {
      split->of_group.push_back(all[e]);
      ++next;
    } else {
      split->rest_squares += square;
      split->rest_fourth += square * square;
      split->rest_largest = std::max(split->rest_largest, square);
    }
  }
  return split;
}

/// What the climb had to say of itself.
template <class Worker>
std::vector<finding> findings_of(ladder<Worker> const& climbed) {
  std::vector<finding> findings;
  if (climbed.unmixed() > 0)
    findings.push_back({finding_kind::not_mixed,
                        "Chains were not mixed on " + std::to_string(climbed.unmixed()) + " of " + std::to_string(climbed.rung()) +
                            " rungs: they did not forget where they began within " + std::to_string(climbed.terms().longest) +
                            " states. Draw one word for each variate (draws.normal(), not a rejection method), seed no "
                            "engine of your own from a word, give a move of your own for words that act together, or "
                            "allow longer chains."});
  if (climbed.failed() > 0)
    findings.push_back({finding_kind::failed_runs,
                        std::to_string(climbed.failed()) + " of " + std::to_string(climbed.terms().draws) +
                            " draws from the prior failed and were set aside as impossible, and moves to failing states "
                            "were turned down. Find out whether runs fail where the reading points."});
  return findings;
}

/// What the last rung left, as a weighted sample: states with counts, lineages as groups, and as base log-weights minus
/// what the likelihood was already used for.
template <class Sampler, class Weighter, class Worker>
weighted_sample<typename Worker::state> sample_of_ladder(ladder<Worker>& climbed, Sampler const& sampler, Weighter const& weighter,
                                                         failures on_failure, std::vector<finding> findings) {
  using X = typename Worker::state;
  constexpr std::size_t items = Worker::player_type::items;
  auto origin = std::make_shared<sample_origin>();
  origin->seed = climbed.terms().seed;
  origin->execute = climbed.execute();
  origin->on_failure = on_failure;
  origin->how = how_drawn::lineages;
  origin->calls = climbed.calls();
  sample_columns columns;
  for (std::size_t k = 0; k < items; ++k) columns.names.push_back(item_name(weighter, k));
  columns.scores.resize(items);
  state_array<X> states;
  std::vector<std::uint64_t> words, counts;
  std::vector<std::size_t> ends;
  std::vector<std::uint32_t> lineages;
  double const power = climbed.target().power;
  for (auto& t : climbed.particles().trails) {
    for (std::size_t v = 0; v < t.visits.size(); ++v) {
      visit const& at = t.visits[v];
      if (climbed.terms().keep_states) {
        states.emplace_back(std::move(t.states[v]));
      } else {
        auto const used = t.words_of(at);
        words.insert(words.end(), used.begin(), used.end());
        ends.push_back(words.size());
      }
      for (std::size_t k = 0; k < items; ++k) columns.scores[k].push_back(t.scores[v * items + k]);
      columns.base.push_back(power == 0.0 ? 0.0 : -power * at.seen.log_likelihood);
      columns.log_weights.push_back(power == 1.0 ? 0.0 : columns.base.back() + at.seen.log_likelihood);
      counts.push_back(at.steps);
      lineages.push_back(t.lineage);
    }
    t = {};
  }
  columns.log_base = climbed.particles().log_evidence();
  columns.base_known = true;
  if constexpr (bounded_weighter<Weighter>) {
    columns.bound_known = true;
    columns.log_bound = weighter.log_bound();
  }
  origin->take_counts(std::move(counts));
  origin->take_labels(lineages);
  origin->influence = influence_of(climbed.particles().influence(), lineages);
  origin->findings = std::move(findings);
  note_doubts(*origin, weighter);
  std::shared_ptr<state_store<X> const> store;
  if (climbed.terms().keep_states)
    store = std::make_shared<kept_states<X, state_array<X>>>(std::move(states));
  else
    store = std::make_shared<word_store<Sampler>>(sampler, std::move(words), std::move(ends));
  return weighted_sample<X>(std::move(store), std::move(columns), std::move(origin), climbed.terms().run);
}

}  // namespace steelyard::inline v1::detail
