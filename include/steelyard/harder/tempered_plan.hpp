// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <functional>
#include <stop_token>
#include <string>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/chrono.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/run/plan.hpp>
#include <steelyard/sample/origin.hpp>

namespace steelyard::inline v1 {

/// How to run a tempered run: every field has a default.
struct tempered_plan {
  count seed = 1;             ///< the same seed gives the same sample
  unsigned threads = 1;       ///< 0: all cores. Many legacy generators are not safe on several threads
  count chains = 200;         ///< errors fall as their number^(-1/2)
  double share = 0.5;         ///< of the effective size that a rung leaves, in (0, 1); the last may leave a little less
  count draws = 0;            ///< prior draws to begin with; 0: 2000, or 10 a chain where that is more
  count shortest = 20;        ///< states of a chain on one rung, at least
  count longest = 400;        ///< and at most
  double level_share = 0.2;   ///< of the particles that the next level of a low probability keeps, in (0, 1)
  bool frozen = false;        ///< find rungs and moves in a pilot run, fix them, and run afresh: the evidence itself
                              ///< (not its logarithm) is then unbiased. About twice the calls
  keeping keep = keeping::states;
  failures on_failure = failures::stop;
  std::chrono::nanoseconds time_limit{0};                     ///< ends after the rung that reaches it; 0: none
  std::function<void(progress_report const&)> progress = {};  ///< after each rung: `drawn` counts sampler calls
  std::stop_token token = {};                                 ///< ends after the current rung
  steelyard::executor executor = {};                          ///< instead of threads of our own
};

namespace detail {

inline void refuse_plan(char const* run, tempered_plan const& how) {
  auto const refuse = [run](std::string what, std::string rule) {
    throw bad_argument(std::string(run) + ": the plan's " + std::move(what) + "; " + std::move(rule));
  };
  if (how.chains < 8u) refuse("chains are " + std::to_string(how.chains.value()), "at least 8 are needed, and 200 are usual");
  auto const is_share = [](double x) { return is_finite(x) && x > 0.0 && x < 1.0; };
  if (!is_share(how.share)) refuse("share is " + plain_number(how.share), "it must lie between 0 and 1");
  if (!is_share(how.level_share))
    refuse("level_share is " + plain_number(how.level_share), "it must lie between 0 and 1");
  if (how.draws != 0u && how.draws < how.chains)
    refuse("draws are " + std::to_string(how.draws.value()), "at least one a chain is needed");
  if (how.shortest < 2u) refuse("shortest chain is " + std::to_string(how.shortest.value()), "at least 2 states are needed");
  if (how.longest < how.shortest)
    refuse("longest chain is " + std::to_string(how.longest.value()), "it must be at least the shortest, " + std::to_string(how.shortest.value()));
  if (how.token.stop_requested()) throw stopped_early(std::string(run) + ": a stop was asked for before the first rung; nothing was drawn");
}

}  // namespace detail

}  // namespace steelyard::inline v1
