// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <tuple>
#include <utility>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/answers.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/estimate/until.hpp>
#include <steelyard/run/checkpoint.hpp>
#include <steelyard/run/rounds.hpp>
#include <steelyard/run/run_worker.hpp>
#include <steelyard/run/start.hpp>
#include <steelyard/sample/reweighing.hpp>

namespace steelyard::inline v1::detail {

/// Facts of a one-pass run from what its weights added up to.
template <class Weighter>
run_facts pass_facts(weight_totals const& totals, sample_origin const& origin, [[maybe_unused]] Weighter const& weighter) {
  run_facts facts = facts_of(totals, origin);
  if constexpr (bounded_weighter<Weighter>) {
    facts.bound_known = true;
    facts.log_bound = weighter.log_bound();
  }
  return facts;
}

/// Whether every question with a target has met it.
template <class Node, class... Es, std::size_t... I>
bool targets_met(Node const& sum, std::tuple<Es...> const& bound, run_facts const& facts, group_facts const& grouping,
                 std::index_sequence<I...>) {
  auto const one = [&](auto const& question, auto const& slot) {
    if constexpr (is_until<std::remove_cvref_t<decltype(question)>>::value)
      return question.met(slot.answer(facts, grouping));
    else
      return true;
  };
  return (one(std::get<I>(bound), std::get<I>(sum.slots)) && ...);
}

/// Names of the readings and columns of the questions: tells checkpoints apart.
template <class State, class... Es, class Weighter>
std::string shape_of(Weighter const& weighter) {
  std::string shape;
  for (std::size_t k = 0; k < item_count<Weighter>(); ++k) shape += item_name(weighter, k) + ";";
  ((shape += std::to_string(columns_of<readouts_t<Es>, State>::size) + "/" + std::to_string(sizeof(slot_t<Es>)) + ","), ...);
  return shape;
}

/// Draws, weighs and answers block by block; no state is kept.
/// @param made_again  states will be made again later, so that a sampler that keeps something is an error
template <class Sampler, class Weighter, class... Es>
auto one_pass(Sampler const& draw, Weighter const& weigh_with, plan const& how, std::tuple<Es...> const& bound,
              bool made_again = false) {
  using state = state_of_t<Sampler>;
  using worker = run_worker<Sampler, Weighter, Es...>;
  sample_origin origin;
  start_run(origin, how);
  run_shared shared;
  shared.terms = terms_of(how);
  shared.size = how.size;
  shared.probed = probed_samples(how.size);
  worker_pool<worker> pool([&] { return std::make_unique<worker>(draw, weigh_with, shared, bound); });
  sweep<state, Es...> all(bound);
  checkpoint_keeper keeper(how, 1, shape_of<state, Es...>(weigh_with));
  std::uint64_t const first = keeper.take_up(shared, [&](byte_reader& in) { all.load(in); });
  rounds turns(how, first, how.size);
  auto const settle = [&](std::uint64_t drawn) {
    origin.drawn = drawn;
    origin.failed = shared.failed;
  };
  auto const satisfied = [&] {
    if (!all.ready()) return false;
    settle(turns.drawn());
    auto const sum = all.so_far();
    return sum->totals.maximum > impossible &&
           targets_met(*sum, bound, pass_facts(sum->totals, origin, weigh_with), origin.grouping(),
                       std::index_sequence_for<Es...>{});
  };
  turns.each([&](std::uint64_t from, std::uint64_t to) { all.take(from, to, origin.execute, pool); },
             [&] { return shared.failed; },
             [&](std::uint64_t next, bool over) {
               if (all.ready()) keeper.leave(next, over, shared, [&](byte_writer& out) { all.save(out); });
             },
             (is_until<Es>::value || ...), satisfied);
  settle(turns.drawn());
  origin.calls = origin.drawn - std::min(origin.drawn, first * block_size);
  origin.findings = turns.findings();
  note_doubts(origin, weigh_with);
  {
    auto const own = pool.take();
    check_replay(own->making(), shared, origin, made_again);
  }
  auto const merged = all.finish();
  weight_totals const& totals = merged->totals;
  if (!(totals.maximum > impossible)) {
    sample_columns seen;
    for (std::size_t k = 0; k < item_count<Weighter>(); ++k) {
      seen.names.push_back(item_name(weigh_with, k));
      seen.scores.push_back({shared.largest.empty() ? impossible : shared.largest[k]});
    }
    throw no_likelihood(no_likelihood_text("estimate", seen, origin));
  }
  run_facts facts = pass_facts(totals, origin, weigh_with);
  facts.health = std::make_shared<diagnosis const>(diagnosis_of(totals, origin, origin.findings, facts.bound_known));
  group_facts const grouping = origin.grouping();
  return std::apply(
      [&](auto const&... slot) {
        auto each = std::make_tuple(slot.answer(facts, grouping)...);
        return answers<std::remove_cvref_t<decltype(slot.answer(facts, grouping))>...>(
            std::move(each), *facts.health, origin.drawn, origin.calls);
      },
      merged->slots);
}

}  // namespace steelyard::inline v1::detail
