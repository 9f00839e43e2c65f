// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/normal.hpp>

#include <boost/math/distributions/normal.hpp>
#include <boost/math/special_functions/erf.hpp>

#include <cmath>

// Reference: Boost.Math in long double.

namespace sy = steelyard::detail;

namespace {

double relative(double got, long double want) {
  return static_cast<double>(std::abs((static_cast<long double>(got) - want) / want));
}

}  // namespace

TEST_CASE("normal quantiles agree with Boost.Math to 1e-15 from the middle to the far tail") {
  boost::math::normal_distribution<long double> const normal;
  double worst = 0.0;
  double at = 0.0;
  for (int k = 1; k <= 6000; ++k) {
    double const p = k % 2 == 0 ? k / 12001.0 : std::ldexp(0.5 + k / 12001.0, -k / 6);  // down to 2^-1000
    double const error = relative(sy::normal_tail_quantile(p), quantile(normal, static_cast<long double>(p)));
    if (error > worst) worst = error, at = p;
  }
  MESSAGE("normal_tail_quantile: worst relative error ", worst, " at p = ", at);
  CHECK(worst < 1e-15);
}

TEST_CASE("normal quantiles: both tails and the middle") {
  CHECK(sy::normal_quantile(0.5) == 0.0);
  CHECK(sy::normal_quantile(0.975) == doctest::Approx(1.959963984540054).epsilon(1e-15));
  CHECK(sy::normal_quantile(0.025) == -sy::normal_upper_quantile(0.025));
  for (double const q : {0.3, 0.025, 1e-3, 1e-9, 1e-30}) CHECK(sy::normal_upper_quantile(q) == -sy::normal_quantile(q));
}

TEST_CASE("quantile pieces meet") {
  // where the approximations change over: q = 0.075 and r = 5, p = exp(-25)
  for (double const p : {0.075, 1.3887943864964021e-11}) {
    double const below = sy::normal_tail_quantile(p * (1.0 - 1e-12));
    double const above = sy::normal_tail_quantile(p * (1.0 + 1e-12));
    CHECK(below < above);
    CHECK(above - below < 1e-11);
  }
}

TEST_CASE("normal tails agree with Boost.Math to 1e-15") {
  double worst = 0.0;
  double at = 0.0;
  for (int k = -1000; k <= 9000; ++k) {
    double const z = k * (37.5 / 9000.0);
    long double const want = boost::math::erfc(static_cast<long double>(z) / std::sqrt(2.0L)) / 2.0L;
    double const error = relative(sy::normal_upper(z), want);
    if (error > worst) worst = error, at = z;
  }
  MESSAGE("normal_upper: worst relative error ", worst, " at z = ", at);
  CHECK(worst < 1e-15);
  CHECK(sy::normal_upper(0.0) == 0.5);
  CHECK(sy::normal_upper(39.0) == 0.0);
  CHECK(sy::normal_cdf(39.0) == 1.0);
}

TEST_CASE("tail probabilities recomputed to 17 digits") {
  // quadrature and closed form in 40-digit arithmetic
  CHECK(relative(sy::normal_upper(3.0), 1.3498980316300945e-3L) < 1e-15);
  CHECK(relative(sy::normal_upper(5.0), 2.8665157187919391e-7L) < 1e-15);
  CHECK(relative(sy::normal_upper(6.0), 9.865876450376981e-10L) < 1e-15);
  CHECK(relative(sy::normal_upper(8.0), 6.2209605742717841e-16L) < 1e-15);
  CHECK(relative(sy::normal_cdf(-3.5), 2.3262907903552504e-4L) < 1e-15);
}

TEST_CASE("quantile and tail are inverse to each other") {
  for (double const z : {0.1, 1.0, 2.5, 5.0, 9.0, 20.0, 37.0})
    CHECK(relative(sy::normal_upper_quantile(sy::normal_upper(z)), static_cast<long double>(z)) < 2e-15);
}
