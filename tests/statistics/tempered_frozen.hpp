// SPDX-License-Identifier: BSL-1.0
#pragma once

// Runs of a tempered conjugate problem with frozen settings, for a short and a long look at the mean of their evidence.

#include <array>
#include <cmath>
#include <cstdint>

#include <steelyard/tempered.hpp>

namespace frozen {

namespace sy = steelyard;

/// Mean of Z/exact - 1 over many runs, with its standard error.
struct mean_error {
  double value = 0.0, standard_error = 0.0, spread = 0.0;
};

/// d = 2, each deviate read as 0.5 with deviation 0.05, by so few chains that Z itself scatters widely.
inline mean_error evidence_of(std::uint64_t runs) {
  using state = std::array<double, 2>;
  double const s = 0.05;
  auto const sampler = [](sy::draws& draws) { return state{draws.normal(), draws.normal()}; };
  auto const weighter = [s](state const& x) {
    double const a = (0.5 - x[0]) / s, b = (0.5 - x[1]) / s;
    return sy::log_likelihood{-0.5 * (a * a + b * b)};
  };
  double const exact = std::log(s * s / (1.0 + s * s)) - 0.25 / (1.0 + s * s);
  sy::pipeline const pipe{sampler, weighter};
  double mean = 0.0, square = 0.0;
  for (std::uint64_t seed = 1; seed <= runs; ++seed) {
    sy::tempered_plan how;
    how.seed = seed;
    how.chains = 16;
    how.draws = 200;
    how.shortest = how.longest = 10;
    how.frozen = true;
    how.keep = sy::keeping::streams;
    double const error = std::exp(sy::run_tempered(pipe, how).log_evidence().value - exact) - 1.0, n = static_cast<double>(seed), d = error - mean;
    mean += d / n;
    square += d * (error - mean);
  }
  double const n = static_cast<double>(runs), variance = square / (n - 1.0);
  return {mean, std::sqrt(variance / n), std::sqrt(variance)};
}

}  // namespace frozen
