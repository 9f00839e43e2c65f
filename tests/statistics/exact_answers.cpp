// SPDX-License-Identifier: BSL-1.0
// legs: every
#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <functional>
#include <set>
#include <string>

#include "statistics/cells.hpp"
#include "statistics/problems.hpp"

// The exact answers of the table by a second way: quadrature over prior times likelihood, sums, published values.

namespace {

using namespace known;

posterior const& exact_of(std::string const& name) { return of(name).exact; }

void by_two_ways(std::string const& name, std::function<double(double)> const& log_product, double low, double high) {
  INFO(name);
  posterior const& got = exact_of(name);
  posterior const want = by_quadrature(log_product, low, high);
  CHECK(std::abs(got.mean - want.mean) < 1e-8 * std::sqrt(want.variance));
  CHECK(std::abs(got.variance / want.variance - 1.0) < 1e-7);
  CHECK(std::abs(got.log_evidence - want.log_evidence) < 1e-8);
  for (double const order : {0.025, 0.4, 0.5, 0.6, 0.9, 0.975}) {
    double const v = want.quantile(order);
    CHECK(std::abs(got.quantile(order) - v) < 1e-7 * std::sqrt(want.variance));
    CHECK(std::abs(got.below(v) - order) < 1e-7);
  }
}

auto log_standard(double x) { return log_normal_density(x, 0.0, 1.0); }

}  // namespace

TEST_CASE("closed forms agree with quadrature over prior times likelihood") {
  by_two_ways("wide normal", [](double x) { return log_standard(x) + log_normal_density(1, x, 1); }, -8, 8);
  by_two_ways("sharp normal", [](double x) { return log_standard(x) + log_normal_density(3, x, 0.5); }, -3, 7);
  by_two_ways("rare event in a narrow posterior", [](double x) { return log_standard(x) + log_normal_density(1, x, 0.1); }, -0.5,
              2.5);
  by_two_ways("lognormal", [](double x) { return log_standard(std::log(x)) - std::log(x) + log_normal_density(0.8, std::log(x), 0.5); },
              0.05, 60);
  by_two_ways("window", [](double) { return 0.0; }, 0.2, 0.5);
  by_two_ways("counts of a rate", [](double x) { return log_gamma_density(x, 2, 0.5) + log_poisson(7, x); }, 1e-9, 60);
  by_two_ways("share of defects", [](double x) { return 3 * std::log(x) + 17 * std::log1p(-x); }, 1e-12, 1.0 - 1e-12);
  by_two_ways("weights of tail 0.3", [](double x) { return -x + 0.3 * x; }, 0, 60);
  by_two_ways("weights without bound", [](double x) { return -x + 0.2 * x; }, 0, 60);
  // x given y = N(0, 1): the reading of y has sd 0.5, so that of x = 0.8 y + 0.6 e has 0.8 x as its mean
  by_two_ways("read through another", [](double x) { return log_standard(x) + log_normal_density(1, 0.8 * x, std::sqrt(0.36 + 0.25)); },
              -5, 6);
  // the sum of twenty given its first: x + N(0, 19)
  by_two_ways("twenty numbers", [](double x) { return log_standard(x) + log_normal_density(6, x, std::sqrt(23)); }, -8, 8);
  by_two_ways("failed runs", [](double x) { return log_standard(x) + log_normal_density(0.5, x, 0.5); }, -0.5, 6);
}

TEST_CASE("published posteriors come out") {
  // Gehan, Biometrika 52, 1965, group 6-MP; computed from the closed form to the digits shown.
  posterior const& lives = exact_of("censored lives");
  CHECK(lives.mean == doctest::Approx(0.02710027100271).epsilon(1e-12));
  CHECK(std::sqrt(lives.variance) == doctest::Approx(0.00856985815763789).epsilon(1e-12));
  CHECK(lives.quantile(0.025) == doctest::Approx(0.0129956333229).epsilon(1e-10));
  CHECK(lives.log_evidence == doctest::Approx(-44.0035538673297566).epsilon(1e-12));
  // Bortkiewicz, Das Gesetz der kleinen Zahlen, 1898: 144, 91, 32, 11, 2 corps-years with 0 to 4 deaths.
  posterior const& kicks = exact_of("horse kicks");
  double const factorials = 32 * std::log(2.0) + 11 * std::log(6.0) + 2 * std::log(24.0);
  CHECK(kicks.mean == doctest::Approx(0.702127659574468).epsilon(1e-12));
  CHECK(std::sqrt(kicks.variance) == doctest::Approx(0.0498980399981216).epsilon(1e-12));
  CHECK(kicks.quantile(0.975) == doctest::Approx(0.803240205169).epsilon(1e-10));
  CHECK(kicks.log_evidence - factorials == doctest::Approx(-316.6053793143109).epsilon(1e-12));
  // Owen, Monte Carlo theory, methods and examples, 2013, ch. 9, with a normal prior and reading.
  CHECK(exact_of("sharp normal").mean == doctest::Approx(2.4).epsilon(1e-12));
  CHECK(exact_of("sharp normal").log_evidence == doctest::Approx(-4.63051030886178).epsilon(1e-12));
}

TEST_CASE("whole numbers: the posterior is a sum") {
  double total = 0.0, first = 0.0;
  for (int k = 0; k < 60; ++k) {
    double const w = std::exp(log_poisson(k, 4) + log_normal_density(6, k, 1.5));
    total += w;
    first += w * k;
  }
  CHECK(exact_of("whole numbers").mean == doctest::Approx(first / total).epsilon(1e-12));
  CHECK(exact_of("whole numbers").log_evidence == doctest::Approx(std::log(total)).epsilon(1e-12));
  CHECK(exact_of("whole numbers").quantile(exact_of("whole numbers").below(5.0)) == 5.0);
}

TEST_CASE("the table names each problem once") {
  std::set<std::string> names;
  for (problem const& p : problems()) CHECK(names.insert(p.name).second);
  CHECK(names.size() >= 30u);
}

TEST_CASE("limits for hits are the exact binomial ones") {
  // False alarm 1e-4 in all: 0.5e-4 on either side gives these for a true 95 %; ours take 1e-4 on either side.
  hit_limits const one(4'000, 0.95, 0.95), accepted_95 = accepted(0.95, 4'000), accepted_few = accepted(0.95, 1'000);
  CHECK(one.least == 3'747u);
  CHECK(one.most == 3'849u);
  CHECK(accepted_95.least == 3'658u);
  CHECK(accepted_95.most == 3'935u);
  CHECK(accepted_few.least == 898u);
  CHECK(accepted_few.most == 991u);
}
