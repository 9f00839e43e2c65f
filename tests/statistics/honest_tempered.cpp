// SPDX-License-Identifier: BSL-1.0
// legs: honest
// Tempered runs over a thousand seeds: how often nominal 95 % error intervals cover, and whether the evidence of frozen
// runs is right on average. One line a cell.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <string>

#include "statistics/tempered_frozen.hpp"

namespace {

namespace sy = steelyard;

struct cell {
  int evidence = 0, mean = 0, sound = 0;
  double square = 0.0;
};

/// d normal deviates, each read as 0.5 with deviation s.
template <std::size_t D>
cell conjugate(double s, int runs, sy::count chains) {
  using state = std::array<double, D>;
  auto const sampler = [](sy::draws& draws) {
    state x{};
    for (double& v : x) v = draws.normal();
    return x;
  };
  auto const weighter = [s](state const& x) {
    double q = 0.0;
    for (double const v : x) q += (0.5 - v) * (0.5 - v);
    return sy::log_likelihood{-0.5 * q / (s * s)};
  };
  double const mean = 0.5 / (1.0 + s * s), log_z = 0.5 * static_cast<double>(D) * (std::log(s * s / (1.0 + s * s)) - 0.25 / (1.0 + s * s));
  sy::pipeline const pipe{sampler, weighter};
  auto const covers = [](sy::estimate const& e, double truth) {
    sy::interval const where = e.error_interval(0.95);
    return where.lower_known && where.lower <= truth && truth <= where.upper;
  };
  cell all;
  for (int seed = 1; seed <= runs; ++seed) {
    sy::tempered_plan how;
    how.seed = static_cast<std::uint64_t>(seed);
    how.chains = chains;
    auto const [x0, z] = sy::run_tempered(pipe, how).estimate(sy::expectation([](state const& x) { return x[0]; }), sy::log_evidence());
    all.evidence += covers(z, log_z) ? 1 : 0;
    all.mean += covers(x0, mean) ? 1 : 0;
    all.sound += z.verdict() == sy::verdict::sound && x0.verdict() == sy::verdict::sound ? 1 : 0;
    all.square += (z.value - log_z) * (z.value - log_z) / (z.standard_error * z.standard_error);
  }
  return all;
}

template <std::size_t D>
void covers_as_claimed(double s, sy::count chains) {
  constexpr int runs = 1000;
  cell const c = conjugate<D>(s, runs, chains);
  std::printf("d %3zu  s %-8g  evidence %.3f  mean %.3f  sound %.3f  mean z^2 of the evidence %.3f\n", D, s, c.evidence / double{runs},
              c.mean / double{runs}, c.sound / double{runs}, c.square / runs);
  std::fflush(stdout);
  CAPTURE(D);
  CAPTURE(s);
  REQUIRE(c.sound >= 950);  // lineages suffice
  // 93 to 97.5 %, and over 1000 runs a true 93 % or 97.5 % is seen within 3.5 of its own standard deviations.
  double const slack_low = 3.5 * std::sqrt(1000 * 0.93 * 0.07), slack_high = 3.5 * std::sqrt(1000 * 0.975 * 0.025);
  for (int const hits : {c.evidence, c.mean}) {
    CHECK(hits >= 930 - slack_low);
    CHECK(hits <= 975 + slack_high);
  }
}

}  // namespace

TEST_CASE("nominal 95 % error intervals of evidence and means") {
  covers_as_claimed<1>(1e-3, 200);
  covers_as_claimed<4>(0.03, 200);
  covers_as_claimed<16>(0.2, 200);
  covers_as_claimed<64>(0.5, 200);
}

TEST_CASE("frozen settings: the mean of the evidence over 1000 runs is the evidence") {
  auto const z = frozen::evidence_of(1000);
  std::printf("frozen: mean of Z over the exact one less 1: %.4f +- %.4f, spread of one run %.2f\n", z.value, z.standard_error, z.spread);
  CHECK(std::abs(z.value) <= 4.0 * z.standard_error);
  CHECK(z.standard_error < 0.05);
}

TEST_CASE("levels: nominal 95 % error intervals of a low probability, and the size of its error") {
  constexpr int runs = 1000;
  double const exact = 0.5 * std::erfc(4.0 / std::sqrt(2.0));
  int hits = 0, sound = 0;
  double square = 0.0;
  for (int seed = 1; seed <= runs; ++seed) {
    sy::tempered_plan how;
    how.seed = static_cast<std::uint64_t>(seed);
    auto const p = sy::low_probability([](sy::draws& draws) { return 0.6 * draws.normal() + 0.8 * draws.normal(); },
                                       [](double x) { return x - 4.0; }, how);
    sy::interval const where = p.error_interval(0.95);
    hits += where.lower <= exact && exact <= where.upper ? 1 : 0;
    sound += p.verdict() == sy::verdict::sound ? 1 : 0;
    double const z = std::log(p.value / exact) / (p.standard_error / p.value);
    square += z * z;
  }
  std::printf("P(Z > 4): covered %.3f  sound %.3f  mean z^2 of its logarithm %.3f\n", hits / double{runs}, sound / double{runs}, square / runs);
  CHECK(hits >= 930 - 3.5 * std::sqrt(1000 * 0.93 * 0.07));
}
