// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/interval.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/progress.hpp>
#include <steelyard/run/plan.hpp>

namespace steelyard::inline v1::proof {

struct coverage_options {
  double level = 0.95;       ///< that the intervals claim
  double lowest = 0.0;       ///< true rates from here are accepted; 0: the level itself
  double highest = 0.0;      ///< true rates up to here are accepted; 0: the level itself
  count repeats = 1'000;
  count first_seed = 1;      ///< seeds are first_seed, first_seed + 1, ...
  double false_alarm = 1e-4;
  steelyard::executor executor = {};
  proof::progress progress = {};
  count budget = 0;          ///< samples drawn at most, by fewer repeats, where a pipeline is asked; 0: repeats x size
};

/// A coverage check with its numbers.
class coverage_check : public check {
 public:
  coverage_check(outcome what, std::string sentence, std::uint64_t hits, std::uint64_t below, std::uint64_t above,
                 std::uint64_t sampler_calls = 0)
      : check(what, std::move(sentence)), hits_(hits), below_(below), above_(above), sampler_calls_(sampler_calls) {}

  [[nodiscard]] std::uint64_t hits() const noexcept { return hits_; }
  /// Intervals that lay wholly below, and wholly above the truth.
  [[nodiscard]] std::uint64_t below() const noexcept { return below_; }
  [[nodiscard]] std::uint64_t above() const noexcept { return above_; }
  /// Where a pipeline was asked; else 0, for the kit does not know.
  [[nodiscard]] std::uint64_t sampler_calls() const noexcept { return sampler_calls_; }

 private:
  std::uint64_t hits_, below_, above_, sampler_calls_;
};

/// Whether intervals cover the truth as often as they claim.
///   interval_for(seed) -> interval, one independent run each; an unknown end covers everything on its side
///   passes while the hits lie within exact binomial limits, half the false-alarm rate on either side; where so few
///   repeats are made that no number of hits could fail, it cannot certify
/// @throws bad_argument for options out of range or an interval with an end that is not finite.
template <class IntervalFor>
coverage_check coverage(IntervalFor const& interval_for, double truth, coverage_options const& options = {}) {
  double const rate = detail::checked_rate("coverage", options.false_alarm);
  double const lowest = options.lowest > 0.0 ? options.lowest : options.level;
  double const highest = options.highest > 0.0 ? options.highest : options.level;
  if (!(lowest > 0.0 && lowest <= highest && highest < 1.0))
    throw bad_argument("coverage: accepted rates from " + detail::up::plain_number(lowest) + " to " +
                       detail::up::plain_number(highest) + " are no range inside (0, 1)");
  if (!detail::up::is_finite(truth))
    throw bad_argument("coverage: the truth, " + detail::up::plain_number(truth) + ", must be a finite number");
  std::uint64_t const repeats = options.repeats;
  if (repeats == 0) throw bad_argument("coverage: 0 repeats were asked for; at least one is needed");
  std::vector<signed char> where(static_cast<std::size_t>(repeats));  // -1 below the truth, 1 above, 0 covers
  detail::up::first_failure failure;
  detail::repeat_counter done(options.progress, repeats);
  constexpr std::uint64_t task = 16;
  options.executor(static_cast<std::size_t>((repeats + task - 1) / task), [&](std::size_t t) {
    std::uint64_t const end = std::min(repeats, (t + 1) * task);
    for (std::uint64_t r = t * task; r < end && !failure.before(r); ++r)
      failure.guard(r, [&] {
        interval const i = interval_for(options.first_seed + r);
        if ((i.lower_known && !detail::up::is_finite(i.lower)) || (i.upper_known && !detail::up::is_finite(i.upper)))
          throw bad_argument("coverage: the interval of seed " + std::to_string(options.first_seed + r) +
                             " has an end that is not a finite number");
        where[static_cast<std::size_t>(r)] = static_cast<signed char>(i.upper_known && i.upper < truth   ? -1
                                                                      : i.lower_known && i.lower > truth ? 1
                                                                                                         : 0);
      });
    done.add(end - t * task);
  });
  failure.rethrow();
  std::uint64_t below = 0, above = 0;
  for (signed char const each : where) {
    below += each < 0 ? 1u : 0u;
    above += each > 0 ? 1u : 0u;
  }
  std::uint64_t const hits = repeats - below - above;
  std::uint64_t const least = detail::hit_limits(repeats, lowest, rate).first;
  std::uint64_t const most = detail::hit_limits(repeats, highest, rate).second;
  std::string text = std::to_string(hits) + " of " + std::to_string(repeats) +
                     " intervals cover the truth; allowed are " + std::to_string(least) + " to " + std::to_string(most);
  outcome result = outcome::passed;
  if (hits < least || hits > most) {
    result = outcome::failed;
    text += hits < least ? ": they are too narrow, " + std::to_string(below) + " lie below and " +
                               std::to_string(above) + " above it"
                         : ": they are too wide";
  } else if (least == 0) {
    result = outcome::cannot_certify;
    text += ", which so few repeats could not miss: cannot certify";
  } else if (most == repeats) {
    text += "; so few repeats cannot show intervals that are too wide";
  }
  return {result, std::move(text), hits, below, above};
}

namespace detail {

/// What one run of a pipeline answers to one question; quantiles and the like want the sample kept.
template <class Pipeline, class Question>
auto ask_pipeline(Pipeline const& pipe, plan const& how, Question const& question, std::atomic<std::uint64_t>& calls) {
  if constexpr (up::takes_everything<Question>) {
    auto answers = pipe.run(how).estimate(question);
    calls += answers.sampler_calls();
    return std::move(answers).template get<0>();
  } else {
    auto answers = pipe.estimate(how, question);
    calls += answers.sampler_calls();
    return std::move(answers).template get<0>();
  }
}

}  // namespace detail

/// Whether the error intervals of a pipeline's answers cover the exact one, over runs that differ in their seed.
///   question  an estimator that answers one estimate: sy::expectation(f), sy::probability(e), sy::quantile(f, p), ...
/// A run in which no sample has any likelihood counts as an unbounded interval.
/// Cost  repeats x size samples.
template <class Pipeline, class Question>
coverage_check coverage(Pipeline const& pipe, plan how, Question const& question, double truth,
                        coverage_options options = {}) {
  if (options.budget > 0u) {
    std::uint64_t const affordable = how.size > 0u ? options.budget.value() / how.size.value() : 0;
    if (affordable == 0)
      throw bad_argument("coverage: a budget of " + std::to_string(options.budget.value()) +
                         " samples does not pay for one run of " + std::to_string(how.size.value()));
    options.repeats = std::min(options.repeats.value(), affordable);
  }
  std::atomic<std::uint64_t> calls{0};
  coverage_check const all = coverage(
      [&](std::uint64_t seed) {
        plan one = how;
        one.seed = seed;
        try {
          return detail::ask_pipeline(pipe, one, question, calls).error_interval(options.level);
        } catch (no_likelihood const&) {
          return interval{};
        }
      },
      truth, options);
  return {all.result(), all.sentence(), all.hits(), all.below(), all.above(), calls.load()};
}

}  // namespace steelyard::inline v1::proof
