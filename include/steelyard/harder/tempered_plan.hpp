// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/base/count.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/sample/origin.hpp>

namespace steelyard::inline v1 {

/// How to run a tempered run: every field has a default.
struct tempered_plan {
  count seed = 1;        ///< the same seed gives the same sample
  unsigned threads = 1;  ///< 0: all cores. Many legacy generators are not safe on several threads
  count chains = 200;    ///< error falls as their number^(-1/2)
  double share = 0.5;    ///< of the effective size that a rung may leave
  count draws = 0;       ///< prior draws to begin with; 0: 2000, or 10 a chain where that is more
  count shortest = 20;   ///< steps of a chain on one rung, at least
  count longest = 400;   ///< and at most
  keeping keep = keeping::states;
  failures on_failure = failures::stop;
  steelyard::executor executor = {};  ///< instead of threads of our own
};

}  // namespace steelyard::inline v1
