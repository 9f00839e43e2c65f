// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <string_view>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/functional.hpp>
#include <steelyard/estimate/answers.hpp>
#include <steelyard/estimate/correlation.hpp>
#include <steelyard/estimate/covariance.hpp>
#include <steelyard/estimate/cumulative.hpp>
#include <steelyard/estimate/difference.hpp>
#include <steelyard/estimate/expectation.hpp>
#include <steelyard/estimate/histogram.hpp>
#include <steelyard/estimate/histogram_2d.hpp>
#include <steelyard/estimate/log_evidence.hpp>
#include <steelyard/estimate/mode.hpp>
#include <steelyard/estimate/moments.hpp>
#include <steelyard/estimate/probability.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/estimate/ratio.hpp>
#include <steelyard/estimate/shortest_interval.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/sample/ensemble.hpp>
#include <steelyard/sample/front_door.hpp>
#include <steelyard/sample/kept_worker.hpp>
#include <steelyard/sample/origin.hpp>
#include <steelyard/sample/reweighing.hpp>

namespace steelyard::inline v1 {

namespace detail {
template <class X>
ensemble<X> resampled(weighted_sample<X> const& sample, count k, resample_options const& options);
template <class X>
std::vector<double> plain_weights(weighted_sample<X> const& sample);
}  // namespace detail

/// States with log-weights and how they were drawn: a cheap handle on shared,
/// immutable data. Questions asked of it answer with error bars.
template <class X>
class weighted_sample {
 public:
  using state_type = X;

  /// Number of states; failed runs have none.
  [[nodiscard]] std::size_t size() const noexcept { return columns_->log_weights.size(); }
  /// Number of samples drawn, counts and failed runs included.
  [[nodiscard]] std::uint64_t drawn() const noexcept { return origin_->drawn; }
  /// Calls of the sampler so far: the run, its spot checks, and every replay.
  [[nodiscard]] std::uint64_t sampler_calls() const noexcept { return origin_->calls + states_->replays(); }
  [[nodiscard]] steelyard::how_drawn how_drawn() const noexcept { return origin_->how; }

  /// @throws not_kept where only streams were kept.
  std::span<X const> states() const {
    if (states_->data() == nullptr)
      throw not_kept("states: this sample kept its streams only; use with_state(i, f), or run with keeping::states");
    return {states_->data(), size()};
  }
  /// f(state i), the state made again where it was not kept. @throws bad_argument for i >= size().
  template <class F>
  auto with_state(std::size_t i, F&& f) const -> std::invoke_result_t<F&, X const&> {
    refuse_past_end("with_state", i);
    using result = std::invoke_result_t<F&, X const&>;
    if (states_->data() != nullptr) return detail::call(f, states_->data()[i]);
    if constexpr (std::is_void_v<result>) {
      detail::unlocated([&] { states_->visit(std::span(&i, 1), [&](std::size_t, X const& x) { detail::call(f, x); }); });
    } else {
      static_assert(!std::is_reference_v<result>, "steelyard: with_state() must return a value: the state may not last");
      std::vector<result> answer;
      detail::unlocated(
          [&] { states_->visit(std::span(&i, 1), [&](std::size_t, X const& x) { answer.push_back(detail::call(f, x)); }); });
      return std::move(answer.front());
    }
  }
  /// A copy of state i. @throws bad_argument for i >= size().
  X state(std::size_t i) const
    requires std::copy_constructible<X>
  {
    return with_state(i, [](X const& state) { return X(state); });
  }
  /// The stream that state i was drawn from; it differs from i after failed runs.
  std::uint64_t sample_index(std::size_t i) const {
    refuse_past_end("sample_index", i);
    return origin_->sample_of(i);
  }

  /// Base log-weight plus every log-likelihood; `lowest()` where impossible.
  [[nodiscard]] std::span<double const> log_weights() const noexcept { return columns_->log_weights; }
  /// Names of the readings; a plain weighter's is "likelihood".
  [[nodiscard]] std::span<std::string const> names() const noexcept { return columns_->names; }
  /// Log-likelihood of one reading. @throws bad_name for one it does not have, with those it has.
  std::span<double const> log_likelihoods(std::string_view name) const {
    return columns_->column(detail::find_name(*columns_, "log_likelihoods", name));
  }

  /// The same states under another weighter; base weights stay.
  template <class Weighter>
  weighted_sample reweigh(Weighter const& weighter) const {
    constexpr bool fine = detail::may_weigh<true, Weighter, X>();
    if constexpr (fine)
      return with_columns(detail::score_states<X>(*states_, *columns_, *origin_, weighter), "reweigh");
    else
      return *this;
  }
  /// The same states under the base weights alone: the prior.
  weighted_sample before() const { return with_columns(detail::without_scores(*columns_), "before"); }
  /// Without the reading of this name. @throws bad_name for one it does not have.
  weighted_sample without(std::string_view name) const {
    return with_columns(detail::without_reading(*columns_, name), "without");
  }
  /// With the reading of this name alone. @throws bad_name for one it does not have.
  weighted_sample only(std::string_view name) const {
    return with_columns(detail::only_reading(*columns_, name), "only");
  }
  /// Given that an event holds: base weights become zero elsewhere, so that `before()` is the prior given the event
  /// and the evidence that of the reading given the event.
  template <class Event>
  weighted_sample given(Event const& event) const {
    constexpr bool fine = event_for<Event, X>;
    static_assert(fine, "steelyard: given() takes an event: a readout that returns bool");
    if constexpr (fine) {
      auto const held = values_of(*this, event, true);
      return with_columns(detail::given_event(*columns_, held), "given");
    } else {
      return *this;
    }
  }

  /// Answers to several questions at once; states that were not kept are made again once for all of them.
  template <class... Es>
  auto estimate(Es const&... questions) const {
    constexpr bool fine = (detail::may_ask<true, Es, X, false>() && ...);
    if constexpr (fine)
      return ask(std::tuple<detail::bound_t<Es, X>...>(detail::for_state<X>(questions)...));
    else
      return detail::refused<detail::refused_answers<Es...>>();
  }

  template <class Readout>
  auto expectation(Readout readout) const {
    return one(steelyard::expectation(std::move(readout)));
  }
  template <class Event>
  auto probability(Event event) const {
    return one(steelyard::probability(std::move(event)));
  }
  template <class Readout, class Edges = automatic_bins_t>
  auto histogram(Readout readout, Edges edges = {}) const {
    return one<histogram_result>(steelyard::histogram(std::move(readout), std::move(edges)));
  }
  /// inf{x : F(x) >= p}.
  template <class Readout>
  auto quantile(Readout readout, double p) const {
    return one<quantile_result>(steelyard::quantile(std::move(readout), p));
  }
  /// Equal-tailed coverage interval of the quantity itself.
  template <class Readout>
  auto interval(Readout readout, double level) const {
    return one<interval_result>(steelyard::coverage_interval(std::move(readout), level));
  }
  template <class First, class Second>
  auto difference(First first, Second second) const {
    return one(steelyard::difference(std::move(first), std::move(second)));
  }
  template <class Top, class Bottom>
  auto ratio(Top top, Bottom bottom) const {
    return one(steelyard::ratio(std::move(top), std::move(bottom)));
  }
  steelyard::estimate log_evidence() const { return one(steelyard::log_evidence()); }
  /// Mean, sd, skewness and kurtosis.
  template <class Readout>
  auto moments(Readout readout) const {
    return one<moments_result>(steelyard::moments(std::move(readout)));
  }
  template <class First, class Second>
  auto correlation(First first, Second second) const {
    return one(steelyard::correlation(std::move(first), std::move(second)));
  }
  template <class Readout>
  auto covariance(Readout readout) const {
    return one(steelyard::covariance(std::move(readout)));
  }
  /// The shortest interval that holds this share; `interval` is the equal-tailed one.
  template <class Readout>
  auto shortest_interval(Readout readout, double level) const {
    return one(steelyard::shortest_interval(std::move(readout), level));
  }
  /// The distribution function: as a step function, or at chosen points.
  template <class Readout>
  auto cumulative(Readout readout) const {
    return one(steelyard::cumulative(std::move(readout)));
  }
  template <class Readout>
  auto cumulative(Readout readout, std::vector<double> points) const {
    return one(steelyard::cumulative(std::move(readout), std::move(points)));
  }
  /// The bin of highest density.
  template <class Readout, class Edges = automatic_bins_t>
  auto mode(Readout readout, Edges edges = {}) const {
    return one(steelyard::mode(std::move(readout), std::move(edges)));
  }
  template <class First, class Second, class XEdges = automatic_bins_t, class YEdges = automatic_bins_t>
  auto histogram_2d(First first, Second second, XEdges x = {}, YEdges y = {}) const {
    return one(steelyard::histogram_2d(std::move(first), std::move(second), std::move(x), std::move(y)));
  }

  [[nodiscard]] steelyard::diagnosis const& diagnosis() const noexcept { return *health_; }

  /// A readout at every state, in order; 0 at impossible states unless `everywhere`.
  template <class Readout>
  std::vector<double> values(Readout const& readout, bool everywhere = false) const {
    constexpr bool one_number = readout_columns<detail::result_t<Readout, X const&>>::size == 1;
    static_assert(one_number, "steelyard: values() takes a readout that returns one number");
    if constexpr (one_number)
      return values_of(*this, readout, everywhere);
    else
      return {};
  }

  /// k states, drawn in proportion to their weights; without replacement no more than have any.
  /// @throws bad_argument for k = 0.
  ensemble<X> resample(count k, resample_options const& options = {}) const {
    return detail::resampled<X>(*this, k, options);
  }

  /// @cond for the other parts of the library
  weighted_sample(std::shared_ptr<detail::state_store<X> const> states, detail::sample_columns columns,
                  std::shared_ptr<detail::sample_origin const> origin, char const* where)
      : states_(std::move(states)),
        columns_(std::make_shared<detail::sample_columns const>(std::move(columns))),
        origin_(std::move(origin)) {
    detail::sweep<X> totals{std::tuple<>()};
    auto pool = pool_for(std::tuple<>());
    totals.take(0, origin_->blocks(size()), origin_->execute, *pool);
    totals_ = totals.finish()->totals;
    if (!(totals_.maximum > detail::impossible)) throw no_likelihood(detail::no_likelihood_text(where, *columns_, *origin_));
    std::vector<finding> findings = origin_->findings;
    for (finding& each : detail::sharpest_reading(*columns_, totals_.effective_size())) findings.push_back(std::move(each));
    health_ = std::make_shared<steelyard::diagnosis const>(
        detail::diagnosis_of(totals_, *origin_, std::move(findings), columns_->bound_known));
  }
  [[nodiscard]] std::shared_ptr<detail::state_store<X> const> const& store() const noexcept { return states_; }
  [[nodiscard]] detail::sample_columns const& columns() const noexcept { return *columns_; }
  [[nodiscard]] std::shared_ptr<detail::sample_origin const> const& origin() const noexcept { return origin_; }
  [[nodiscard]] run_facts facts() const {
    run_facts facts = detail::facts_of(totals_, *origin_);
    facts.base_maximum = columns_->base_maximum;
    facts.base = columns_->log_base;
    if (columns_->given) facts.failed = 0;
    if (!columns_->base_known) facts.influence = nullptr;
    facts.bound_known = columns_->bound_known;
    facts.log_bound = columns_->log_bound;
    facts.health = health_;
    return facts;
  }
  /// @endcond

 private:
  weighted_sample with_columns(detail::sample_columns columns, char const* where) const {
    return weighted_sample(states_, std::move(columns), origin_, where);
  }
  void refuse_past_end(char const* where, std::size_t i) const {
    if (i >= size())
      throw bad_argument(std::string(where) + ": there is no state " + std::to_string(i) + " among " + std::to_string(size()));
  }
  template <class... Es>
  auto pool_for(std::tuple<Es...> const& bound) const {
    using worker = detail::kept_worker<X, Es...>;
    return std::make_unique<detail::worker_pool<worker>>(
        [this, &bound] { return std::make_unique<worker>(*states_, *columns_, *origin_, bound); });
  }
  template <class IfRefused = steelyard::estimate, class E>
  auto one(E const& question) const {
    constexpr bool fine = detail::may_ask<true, E, X, false>();
    if constexpr (fine)
      return ask(std::tuple<detail::bound_t<E, X>>(detail::for_state<X>(question))).template get<0>();
    else
      return detail::refused<IfRefused>();
  }
  template <class... Es>
  auto ask(std::tuple<Es...> const& bound) const {
    detail::sweep<X, Es...> all(bound);
    auto const pool = pool_for(bound);
    all.take(0, origin_->blocks(size()), origin_->execute, *pool);
    auto const merged = all.finish();
    run_facts const known = facts();
    detail::group_facts const grouping = origin_->grouping();
    return std::apply(
        [&](auto const&... slot) {
          auto each = std::make_tuple(slot.answer(known, grouping)...);
          return answers<std::remove_cvref_t<decltype(slot.answer(known, grouping))>...>(std::move(each), *health_, drawn(),
                                                                                         sampler_calls());
        },
        merged->slots);
  }
  template <class Readout>
  static std::vector<double> values_of(weighted_sample const& sample, Readout const& readout, bool everywhere) {
    return detail::read_states<X>(*sample.states_, *sample.columns_, *sample.origin_, readout, everywhere);
  }

  std::shared_ptr<detail::state_store<X> const> states_;
  std::shared_ptr<detail::sample_columns const> columns_;
  std::shared_ptr<detail::sample_origin const> origin_;
  detail::weight_totals totals_;
  std::shared_ptr<steelyard::diagnosis const> health_;
};

}  // namespace steelyard::inline v1
