// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <string>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/run/front_door.hpp>
#include <steelyard/run/keeping_run.hpp>
#include <steelyard/run/one_pass.hpp>
#include <steelyard/run/plan.hpp>
#include <steelyard/run/replay_store.hpp>
#include <steelyard/run/slots.hpp>
#include <steelyard/sample/front_door.hpp>
#include <steelyard/sample/resample.hpp>
#include <steelyard/sample/weigh.hpp>
#include <steelyard/weigh/front_door.hpp>

namespace steelyard::inline v1 {

/// A sampler and a weighter, ready to run.
///   sampler:  state X(draws&), or std::optional of one where a run may fail
///   weighter: log_likelihood or likelihood (X const&), or itemised
/// Both are stored by value and called as const, perhaps from several threads at once.
template <class Sampler, class Weighter>
class pipeline {
 public:
  using state_type = std::conditional_t<detail::may_draw<false, Sampler>(), state_of_t<Sampler>, detail::no_state>;

  pipeline(Sampler draw_with, Weighter weigh_with) : sampler_(std::move(draw_with)), weighter_(std::move(weigh_with)) {}

  [[nodiscard]] Sampler const& sampler() const noexcept { return sampler_; }
  [[nodiscard]] Weighter const& weighter() const noexcept { return weighter_; }

  /// Draws and weighs; keeps the states, or their streams.
  /// @throws failed_sample where a user's function throws, bad_weight, no_likelihood, bad_argument, stopped_early
  weighted_sample<state_type> run(plan const& how) const {
    if constexpr (fits) {
      auto origin = std::make_shared<detail::sample_origin>();
      detail::start_run(*origin, how);
      detail::kept_part<state_type> part;
      detail::keeping_run(sampler_, weighter_, how, 0, *origin, part);
      return assemble(std::move(origin), std::move(part), how.keep);
    } else {
      detail::refused<void>();
    }
  }

  /// `more` further samples, drawn as the sample's own run drew; states are moved when nobody else holds them,
  /// copied when they can be, and made again otherwise.
  weighted_sample<state_type> extend(weighted_sample<state_type> sample, count more) const {
    if constexpr (fits) {
      if (!sample.origin()->from_run)
        throw bad_argument("extend: this sample was not drawn by a pipeline; weigh the longer ensemble instead");
      auto origin = std::make_shared<detail::sample_origin>(*sample.origin());
      std::erase_if(origin->findings, [](finding const& each) { return each.kind != finding_kind::hidden_state; });
      origin->calls = sample.sampler_calls();
      plan how;
      how.size = origin->drawn + more;
      how.seed = origin->seed;
      how.source = origin->source;
      how.on_failure = origin->on_failure;
      how.executor = origin->execute;
      how.keep = sample.store()->data() != nullptr ? keeping::states : keeping::streams;
      detail::refuse_size(how);
      detail::kept_part<state_type> part = taken_apart(std::move(sample), how, origin->calls);
      std::uint64_t const from = origin->drawn;
      detail::keeping_run(sampler_, weighter_, how, from, *origin, part);
      return assemble(std::move(origin), std::move(part), how.keep);
    } else {
      detail::refused<void>();
    }
  }

  /// Answers in one pass and constant memory: no state is kept.
  template <class... Es>
  auto estimate(plan const& how, Es const&... questions) const {
    constexpr bool fine = fits && (detail::may_ask<true, Es, state_type, true>() && ...);
    if constexpr (fine)
      return pass(how, std::tuple<detail::bound_t<Es, state_type>...>(detail::for_state<state_type>(questions)...));
    else
      return detail::refused<detail::refused_answers<Es...>>();
  }

  template <class Readout>
  auto expectation(plan const& how, Readout readout) const {
    return one(how, steelyard::expectation(std::move(readout)));
  }
  template <class Event>
  auto probability(plan const& how, Event event) const {
    return one(how, steelyard::probability(std::move(event)));
  }
  template <class Readout, class Edges = automatic_bins_t>
  auto histogram(plan const& how, Readout readout, Edges edges = {}) const {
    return one<histogram_result>(how, steelyard::histogram(std::move(readout), std::move(edges)));
  }
  template <class First, class Second>
  auto difference(plan const& how, First first, Second second) const {
    return one(how, steelyard::difference(std::move(first), std::move(second)));
  }
  template <class Top, class Bottom>
  auto ratio(plan const& how, Top top, Bottom bottom) const {
    return one(how, steelyard::ratio(std::move(top), std::move(bottom)));
  }
  auto log_evidence(plan const& how) const { return one(how, steelyard::log_evidence()); }
  template <class Readout>
  auto moments(plan const& how, Readout readout) const {
    return one<moments_result>(how, steelyard::moments(std::move(readout)));
  }
  template <class First, class Second>
  auto correlation(plan const& how, First first, Second second) const {
    return one(how, steelyard::correlation(std::move(first), std::move(second)));
  }
  template <class Readout>
  auto covariance(plan const& how, Readout readout) const {
    return one(how, steelyard::covariance(std::move(readout)));
  }
  template <class Readout>
  auto cumulative(plan const& how, Readout readout, std::vector<double> points) const {
    return one(how, steelyard::cumulative(std::move(readout), std::move(points)));
  }
  template <class Readout, class Edges = automatic_bins_t>
  auto mode(plan const& how, Readout readout, Edges edges = {}) const {
    return one(how, steelyard::mode(std::move(readout), std::move(edges)));
  }
  template <class First, class Second, class XEdges = automatic_bins_t, class YEdges = automatic_bins_t>
  auto histogram_2d(plan const& how, First first, Second second, XEdges x = {}, YEdges y = {}) const {
    return one(how, steelyard::histogram_2d(std::move(first), std::move(second), std::move(x), std::move(y)));
  }

  /// k states in proportion to their weights, in one pass: their streams are kept, and the states made again.
  ensemble<state_type> resample(plan const& how, count k) const {
    if constexpr (fits) {
      if (k == 0u) throw bad_argument("resample: 0 states were asked for; at least one is allowed");
      std::tuple const slots_of(detail::slots_estimator(static_cast<std::size_t>(k.value()), how.seed));
      auto const answers = detail::one_pass(sampler_, weighter_, how, slots_of, true);
      detail::slots_result const& slots = answers.template get<0>();
      std::vector<std::size_t> const samples(slots.samples.begin(), slots.samples.end());
      auto replays = std::make_shared<detail::replay_store<Sampler> const>(sampler_, detail::terms_of(how),
                                                                          std::make_shared<detail::sample_origin>());
      auto [states, places] = detail::gathered<state_type>(replays, samples);
      return ensemble<state_type>(std::move(states), std::move(places), samples, slots.weights,
                                  answers.diagnosis().effective_size());
    } else {
      detail::refused<void>();
    }
  }

  /// The state of sample i, or the exception its sampler throws.
  state_type replay(plan const& how, count i) const {
    if constexpr (fits) {
      detail::run_terms const from = detail::terms_of(how);
      draws source(how.seed);
      detail::seat_on_sample(source, from, i);
      decltype(auto) call = detail::instance_of<Sampler>::make(sampler_);
      if constexpr (detail::unwrap_optional<detail::result_t<Sampler, draws&>>::may_be_empty) {
        auto drawn = detail::call(call, source);
        if (!drawn.has_value())
          throw failed_sample("replay: the sampler of sample " + std::to_string(i.value()) + " returned no state", i);
        return *std::move(drawn);
      } else {
        return detail::call(call, source);
      }
    } else {
      detail::refused<void>();
    }
  }

 private:
  static constexpr std::bool_constant<detail::may_draw<true, Sampler>() && detail::may_weigh<true, Weighter, state_type>()>
      fits{};  // in its type, so that declaring a pipeline is enough to be told
  using maker_t = detail::maker<Sampler, Weighter>;

  weighted_sample<state_type> assemble(std::shared_ptr<detail::sample_origin> origin, detail::kept_part<state_type> part,
                                       keeping keep) const {
    detail::sample_columns columns;
    for (std::size_t k = 0; k < maker_t::items; ++k) columns.names.push_back(detail::item_name(weighter_, k));
    columns.log_weights = std::move(part.log_weights);
    columns.scores = std::move(part.scores);
    if constexpr (detail::bounded_weighter<Weighter>) {
      columns.bound_known = true;
      columns.log_bound = weighter_.log_bound();
    }
    if (origin->how == how_drawn::replicated) {
      origin->groups.clear();
      for (std::uint64_t const i : part.samples) origin->groups.push_back(static_cast<std::uint32_t>(origin->source.replicate_of(i)));
    }
    origin->samples = origin->failed > 0 ? std::move(part.samples) : std::vector<std::uint64_t>();
    std::shared_ptr<detail::sample_origin const> const settled = std::move(origin);
    std::shared_ptr<detail::state_store<state_type> const> states;
    using array = detail::state_array<state_type>;
    if (keep == keeping::states)
      states = std::make_shared<detail::kept_states<state_type, array>>(std::move(part.states));
    else
      states = std::make_shared<detail::replay_store<Sampler>>(
          sampler_, detail::run_terms{settled->seed, settled->source, settled->on_failure}, settled);
    return weighted_sample<state_type>(std::move(states), std::move(columns), settled, "run");
  }

  /// The columns of a sample and its states, to be added to.
  detail::kept_part<state_type> taken_apart(weighted_sample<state_type> sample, plan const& how, std::uint64_t& calls) const {
    using array = detail::state_array<state_type>;
    detail::kept_part<state_type> part;
    detail::sample_columns const& columns = sample.columns();
    auto const same_names = [&] {
      for (std::size_t k = 0; k < maker_t::items; ++k)
        if (columns.names.size() != maker_t::items || columns.names[k] != detail::item_name(weighter_, k)) return false;
      return true;
    };
    if (!columns.base.empty() || !same_names())
      throw bad_argument("extend: this sample was weighed by another weighter than this pipeline's; extend it before reweighing");
    part.log_weights = columns.log_weights;
    if (maker_t::items > 1) part.scores = columns.scores;
    for (std::size_t i = 0; i < sample.size(); ++i) part.samples.push_back(sample.sample_index(i));
    if (how.keep != keeping::states) return part;
    std::size_t const size = sample.size();
    auto const shared = std::const_pointer_cast<detail::state_store<state_type>>(sample.store());
    auto* const own = dynamic_cast<detail::kept_states<state_type, array>*>(shared.get());
    bool const alone = sample.store().use_count() == 2;  // the sample's own handle and `shared`
    if (own != nullptr && alone) {
      part.states = std::move(own->holder());
    } else if constexpr (std::is_copy_constructible_v<state_type>) {
      for (std::size_t i = 0; i < size; ++i) part.states.emplace_back(shared->data()[i]);
    } else {
      for (std::uint64_t const i : part.samples) part.states.emplace_back(replay(how, i));
      calls += part.samples.size();
    }
    return part;
  }

  template <class IfRefused = steelyard::estimate, class E>
  auto one(plan const& how, E const& question) const {
    constexpr bool fine = fits && detail::may_ask<true, E, state_type, true>();
    if constexpr (fine)
      return pass(how, std::tuple<detail::bound_t<E, state_type>>(detail::for_state<state_type>(question))).template get<0>();
    else
      return detail::refused<IfRefused>();
  }

  template <class... Es>
  auto pass(plan const& how, std::tuple<Es...> const& bound) const {
    return detail::one_pass(sampler_, weighter_, how, bound);
  }

  Sampler sampler_;
  Weighter weighter_;
};

}  // namespace steelyard::inline v1
