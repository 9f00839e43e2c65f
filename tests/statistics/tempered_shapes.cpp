// SPDX-License-Identifier: BSL-1.0
// Posteriors of awkward shape, in closed form: thin straight ridges, and several modes. Tempered runs are right on
// average there, with error bars that say how far off they are, and take no more calls than a plain shape as sharp.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>

#include <steelyard/tempered.hpp>

namespace sy = steelyard;

namespace {

using state = std::array<double, 2>;
state two_normals(sy::draws& draws) { return {draws.normal(), draws.normal()}; }

// Unoptimised code takes ten times as long and is right or wrong in the same way: two seeds show that it runs there.
#ifdef __OPTIMIZE__
constexpr int runs = 24;
#else
constexpr int runs = 2;
#endif

/// Mean of (value - truth) / standard error over runs, and of its square.
struct scores {
  double sum = 0.0, squares = 0.0;
  void add(sy::estimate const& e, double truth) {
    double const z = (e.value - truth) / e.standard_error;
    sum += z;
    squares += z * z;
  }
};
/// Over n runs the mean of z has deviation 1/sqrt(n), that of z^2 sqrt(2/n). Of the square both sides are limited, the
/// upper one more widely, since few lineages make the tails of z longer than normal.
void right(scores const& seen, int n) {
  CHECK(std::abs(seen.sum / n) <= 4.0 / std::sqrt(n));
  CHECK(seen.squares / n <= 1.0 + 5.0 * std::sqrt(2.0 / n));
  CHECK(seen.squares / n >= 1.0 - 4.0 * std::sqrt(2.0 / n));
}

struct outcome {
  scores evidence, mean;
  double calls = 0.0;
};
template <class Weighter, class Readout>
outcome over_seeds(Weighter const& weighter, double log_z, Readout const& readout, double mean) {
  sy::pipeline const pipe{&two_normals, weighter};
  outcome all;
  for (int seed = 1; seed <= runs; ++seed) {
    sy::tempered_plan how;
    how.seed = static_cast<std::uint64_t>(seed);
    how.chains = 100;
    how.draws = 1000;
    auto const found = sy::run_tempered(pipe, how).estimate(sy::log_evidence(), sy::expectation(readout));
    auto const& [z, m] = found;
    all.evidence.add(z, log_z);
    all.mean.add(m, mean);
    all.calls += static_cast<double>(found.sampler_calls());
  }
  return all;
}

/// Linear readings of two standard normal deviates: (ax + by - 1)/s, the evidence N(1; 0, a^2 + b^2 + s^2) in units of
/// the peak, the mean of x a/(a^2 + b^2 + s^2).
outcome linear(double a, double b, double s) {
  double const variance = a * a + b * b + s * s;
  auto const weighter = [=](state const& x) {
    double const z = (1.0 - a * x[0] - b * x[1]) / s;
    return sy::log_likelihood{-0.5 * z * z};
  };
  return over_seeds(weighter, 0.5 * (std::log(s * s / variance) - 1.0 / variance), [](state const& x) { return x[0]; }, a / variance);
}

}  // namespace

TEST_CASE("thin straight ridges of two words") {
  // Turned by 45 degrees, reading (x + y)/sqrt(2) is reading one word: the same evidence, and the same calls.
  outcome together;
  for (double const ratio : {1e-2, 1e-3, 1e-4}) {
    CAPTURE(ratio);
    outcome const ridge = linear(std::sqrt(0.5), std::sqrt(0.5), ratio), plain = linear(1.0, 0.0, ratio);
    right(ridge.evidence, runs);
    right(ridge.mean, runs);
    CHECK(ridge.calls <= 1.1 * plain.calls);
    together.evidence.sum += ridge.evidence.sum;
    together.evidence.squares += ridge.evidence.squares;
    together.mean.sum += ridge.mean.sum;
    together.mean.squares += ridge.mean.squares;
  }
  right(together.evidence, 3 * runs);
  right(together.mean, 3 * runs);
}

TEST_CASE("two modes in one word, with another word that is read alone") {
  // |x| read as 1 is twice the evidence of x read as 1; each mode has half of it, and calls are those of one mode.
  double const s = 1e-3, variance = 1.0 + s * s;
  auto const weighter_of = [s](bool both) {
    return [s, both](state const& x) {
      double const z = (1.0 - (both ? std::abs(x[0]) : x[0])) / s, u = (0.5 - x[1]) / s;
      return sy::log_likelihood{-0.5 * (z * z + u * u)};
    };
  };
  double const log_z = std::log(s * s / variance) - 0.5 * 1.25 / variance;
  outcome const both = over_seeds(weighter_of(true), log_z + std::log(2.0), [](state const& x) { return x[0] > 0.0 ? 1.0 : 0.0; }, 0.5);
  outcome const one = over_seeds(weighter_of(false), log_z, [](state const& x) { return x[1]; }, 0.5 / variance);
  right(both.evidence, runs);
  right(both.mean, runs);
  CHECK(both.calls <= 1.1 * one.calls);
}
