// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <functional>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/interval.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>

namespace steelyard::inline v1::proof {

struct coverage_options {
  double level = 0.95;       ///< that the intervals claim
  double lowest = 0.0;       ///< true rates from here are accepted; 0: the level itself
  double highest = 0.0;      ///< true rates up to here are accepted; 0: the level itself
  count repeats = 1'000;
  count first_seed = 1;      ///< seeds are first_seed, first_seed + 1, ...
  double false_alarm = 1e-4;
  steelyard::executor executor = {};
  std::function<void(std::uint64_t done, std::uint64_t repeats)> progress = {};
};

/// A coverage check with its numbers.
class coverage_check : public check {
 public:
  coverage_check(outcome what, std::string sentence, std::uint64_t hits, std::uint64_t below, std::uint64_t above)
      : check(what, std::move(sentence)), hits_(hits), below_(below), above_(above) {}

  [[nodiscard]] std::uint64_t hits() const noexcept { return hits_; }
  /// Intervals that lay wholly below, and wholly above the truth.
  [[nodiscard]] std::uint64_t below() const noexcept { return below_; }
  [[nodiscard]] std::uint64_t above() const noexcept { return above_; }

 private:
  std::uint64_t hits_, below_, above_;
};

/// Whether intervals cover the truth as often as they claim.
///   interval_for(seed) -> interval, one independent run each; an unknown end covers everything on its side
///   passes while the hits lie within exact binomial limits, half the false-alarm rate on either side
template <class IntervalFor>
coverage_check coverage(IntervalFor const& interval_for, double truth, coverage_options const& options = {}) {
  double const rate = detail::checked_rate("coverage", options.false_alarm);
  double const lowest = options.lowest > 0.0 ? options.lowest : options.level;
  double const highest = options.highest > 0.0 ? options.highest : options.level;
  if (!(lowest > 0.0 && lowest <= highest && highest < 1.0))
    throw bad_argument("coverage: accepted rates from " + detail::up::plain_number(lowest) + " to " +
                       detail::up::plain_number(highest) + " are no range inside (0, 1)");
  std::uint64_t const repeats = options.repeats;
  if (repeats == 0) throw bad_argument("coverage: 0 repeats were asked for; at least one is needed");
  std::vector<signed char> where(static_cast<std::size_t>(repeats));  // -1 below the truth, 1 above, 0 covers
  detail::up::first_failure failure;
  constexpr std::uint64_t task = 16;
  options.executor(static_cast<std::size_t>((repeats + task - 1) / task), [&](std::size_t t) {
    std::uint64_t const end = std::min(repeats, (t + 1) * task);
    for (std::uint64_t r = t * task; r < end; ++r)
      failure.guard(r, [&] {
        interval const i = interval_for(options.first_seed + r);
        where[static_cast<std::size_t>(r)] = static_cast<signed char>(i.upper_known && i.upper < truth   ? -1
                                                                      : i.lower_known && i.lower > truth ? 1
                                                                                                         : 0);
      });
    if (options.progress) options.progress(end, repeats);
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
  bool const fine = hits >= least && hits <= most;
  std::string text = std::to_string(hits) + " of " + std::to_string(repeats) + " intervals cover the truth; allowed are " +
                     std::to_string(least) + " to " + std::to_string(most);
  if (!fine)
    text += hits < least ? ": they are too narrow, " + std::to_string(below) + " lie below and " + std::to_string(above) + " above it"
                         : ": they are too wide";
  return {fine ? outcome::passed : outcome::failed, std::move(text), hits, below, above};
}

}  // namespace steelyard::inline v1::proof
