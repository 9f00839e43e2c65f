// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/core.hpp>

#include <array>
#include <cstddef>
#include <string>
#include <utility>
#include <vector>

#include "statistics/cells.hpp"
#include "statistics/problems.hpp"

// What every problem is asked: each estimator, with the exact answer beside it.

namespace known {

/// The bin asked for: a fifth of the posterior, in the middle.
inline std::pair<double, double> middle_bin(posterior const& exact) {
  double const half = exact.lattice ? 0.5 : 0.0;
  return {exact.quantile(0.4) - half, exact.quantile(0.6) + half};
}

inline constexpr std::array<char const*, 14> questions{"mean",         "mean of square", "sum by covariance", "probability",
                                                       "bin",          "density",        "median",            "quantile 0.9",
                                                       "interval from", "interval to",   "log evidence",      "difference",
                                                       "ratio",        "own estimator"};

inline bool is_quantile(std::string const& question) {
  return question == "median" || question == "quantile 0.9" || question.starts_with("interval");
}

/// Question 2 is no estimate: it only has a standard error, from the covariance of two.
inline constexpr std::size_t by_covariance = 2;

/// A run in which no state had any likelihood gives no answer, which counts as `broken`.
template <class Ask>
std::vector<asked> or_nothing(std::size_t count, Ask const& ask) {
  try {
    return ask();
  } catch (sy::no_likelihood const&) {
    return std::vector<asked>(count);
  }
}

/// Answers to all of them, in that order; compiled once, in support/questions.cpp.
std::vector<asked> ask_all(sy::weighted_sample<point> const& sample, problem const& p);

}  // namespace known
