// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/harder/levels.hpp>
#include <steelyard/harder/tempered_sample.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

/// The probability of an event, its error, and states in which it happens. Error intervals are symmetric in the logit.
template <class X>
class low_probability_result : public estimate {
 public:
  low_probability_result(estimate const& p, std::optional<weighted_sample<X>> states, steelyard::diagnosis health, std::size_t levels,
                         std::uint64_t calls)
      : estimate(p), states_(std::move(states)), health_(std::move(health)), levels_(levels), calls_(calls) {
    this->lower_verdict(health_.verdict());
  }

  /// States in which the event happens, in proportion to their probability, with a count each.
  /// @throws not_kept where none was found
  [[nodiscard]] weighted_sample<X> const& sample() const {
    if (!states_) throw not_kept("low_probability: no state with a margin above zero was found, so there is none to look at");
    return *states_;
  }
  [[nodiscard]] steelyard::diagnosis const& diagnosis() const noexcept { return health_; }
  /// Levels climbed, the last one at zero.
  [[nodiscard]] std::size_t levels() const noexcept { return levels_; }
  [[nodiscard]] std::uint64_t sampler_calls() const noexcept { return calls_; }

 private:
  std::optional<weighted_sample<X>> states_;
  steelyard::diagnosis health_;
  std::size_t levels_;
  std::uint64_t calls_;
};

namespace detail {

/// Error terms of a probability from each lineage's influence on its logarithm, and at least the floor.
inline error_terms level_terms(std::vector<double> const& influence, double p, double floor_square, double correction) {
  error_terms terms;
  for (double const each : influence) {
    double const square = p * p * each * each;
    terms.sum_squares += square;
    terms.sum_fourth += square * square;
    terms.largest_square = std::max(terms.largest_square, square);
  }
  double const least = p * p * floor_square / correction;
  if (terms.sum_squares > 0.0 && terms.sum_squares < least) {
    double const up = least / terms.sum_squares;
    terms.sum_squares = least;
    terms.sum_fourth *= up * up;
    terms.largest_square *= up;
  }
  return terms;
}

template <class Worker>
finding not_reached_finding(level_climb<Worker> const& levels, double p) {
  auto const& on = levels.on();
  std::string const level = on.target().level > impossible ? "a margin of " + short_number(on.target().level) : "no level at all";
  if (levels.ended() != nullptr)
    return {finding_kind::stopped, "The run ended because " + std::string(levels.ended()) + ", at " + level + ", which is reached with probability " +
                                       short_number(p) + "; the event is less probable than that."};
  if (levels.fell_short())
    return {finding_kind::target_missed, "With the levels of the pilot run fixed, no particle went beyond " + level +
                                             ": the answer is 0, which its mean over many such runs allows for. Use more chains."};
  if (levels.levels() >= most_levels)
    return {finding_kind::target_missed, std::to_string(levels.levels()) + " levels reached " + level + ", with a probability of about " +
                                             short_number(p) + ": the event may be impossible. Check the margin and its sign."};
  return {finding_kind::target_missed, "No particle went beyond " + level + ", which is reached with probability " + short_number(p) +
                                           ": the event may be impossible, or its margin may jump too far. Check the margin and "
                                           "its sign, let it tell how near the event is, or use more chains."};
}

/// What the levels came to. The particles are used up.
template <class Worker, class Sampler, class Weighter>
low_probability_result<typename Worker::state> result_of_levels(level_climb<Worker> const& levels, Sampler const& sampler,
                                                                Weighter const& weighter, failures on_failure) {
  using X = typename Worker::state;
  ladder<Worker>& on = levels.on();
  double const p = portable_exp(levels.log_probability());
  std::vector<double> const influence = levels.influence();
  std::vector<finding> findings = findings_of(on);
  if (levels.reached()) {
    weighted_sample<X> states = sample_of_ladder(on, sampler, weighter, on_failure, std::move(findings));
    run_facts facts = states.facts();
    // From a single lineage no error can be told: an error bar of the floor alone, and a broken verdict.
    if (facts.groups < 1.5) facts.group_share_squares = 0.0;
    estimate const answer(std::min(1.0, p), level_terms(influence, p, levels.floor_square(), facts.correction()), facts, error_scale::logit);
    steelyard::diagnosis health = states.diagnosis();
    return {answer, std::move(states), std::move(health), levels.levels(), on.calls()};
  }
  findings.push_back(not_reached_finding(levels, p));
  std::vector<double> shares(influence.size(), 0.0);
  double whole = 0.0, squares = 0.0;
  for (auto const& t : on.particles().trails)
    for (visit const& v : t.visits) {
      shares[t.lineage] += static_cast<double>(v.steps);
      whole += static_cast<double>(v.steps);
    }
  for (double const share : shares) squares += (share / whole) * (share / whole);
  run_facts facts;
  facts.how = how_drawn::lineages;
  facts.largest_unit = squares;
  steelyard::diagnosis::numbers numbers;
  numbers.drawn = numbers.states = static_cast<std::uint64_t>(whole);
  numbers.lineages = 1.0 / squares;
  return {estimate::one_sided(false, facts).scaled(p), std::nullopt, steelyard::diagnosis(numbers, std::move(findings)), levels.levels(),
          on.calls()};
}

}  // namespace detail

}  // namespace steelyard::inline v1
