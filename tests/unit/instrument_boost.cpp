// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Every instrument against the distribution of Boost.Math that has its name,
// where probabilities are large enough for those: densities, both tails, and
// counts and tails of counts.

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>

#include <doctest/doctest.h>
#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/exponential.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/laplace.hpp>
#include <boost/math/distributions/logistic.hpp>
#include <boost/math/distributions/lognormal.hpp>
#include <boost/math/distributions/negative_binomial.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/poisson.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/distributions/triangular.hpp>
#include <boost/math/distributions/uniform.hpp>
#include <boost/math/special_functions/beta.hpp>

#include <steelyard/instrument/instruments.hpp>

namespace sy = steelyard;
namespace bm = boost::math;

namespace {

/// Gap of a score from the logarithm of Boost's value, 0 where that has vanished.
double gap_from(sy::log_likelihood score, double value) {
  return value > 1e-290 ? std::abs(score.value - std::log(value)) : 0.0;
}

/// Largest gap of a continuous instrument's logarithms from Boost's, over readings
/// from a to b that both hold possible.
template <class Instrument, class Law>
double worst(Instrument const& instrument, double truth, Law const& law, double a, double b) {
  double gap = 0.0;
  for (int i = 1; i < 400; ++i) {
    double const x = a + (b - a) * i / 400.0, y = x + 0.3 * (b - a) * i / 400.0;
    gap = std::max(gap, gap_from(instrument.score(x, truth), bm::pdf(law, x)));
    gap = std::max(gap, gap_from(instrument.score(sy::under(x), truth), bm::cdf(law, x)));
    gap = std::max(gap, gap_from(instrument.score(sy::over(x), truth), bm::cdf(bm::complement(law, x))));
    double const p = std::exp(instrument.score(sy::within(x, y), truth).value);
    double const above = bm::cdf(bm::complement(law, x)) - (y < b ? bm::cdf(bm::complement(law, y)) : 0.0);
    double const below = (y < b ? bm::cdf(law, y) : 1.0) - bm::cdf(law, x);
    if (y < b) gap = std::max(gap, std::min(std::abs(p - above), std::abs(p - below)));
  }
  return gap;
}

/// The same for counts from 0 to last.
template <class Instrument, class Law>
double worst_count(Instrument const& instrument, double truth, Law const& law, int last) {
  double gap = 0.0;
  for (int n = 0; n <= last; ++n) {
    gap = std::max(gap, gap_from(instrument.score(n, truth), bm::pdf(law, n)));
    if (n < last) gap = std::max(gap, gap_from(instrument.score(sy::over(n), truth), bm::cdf(bm::complement(law, n))));
    if (n > 0) gap = std::max(gap, gap_from(instrument.score(sy::under(n), truth), bm::cdf(law, n - 1)));
  }
  return gap;
}

}  // namespace

TEST_CASE("continuous instruments agree with Boost.Math") {
  CHECK(worst(sy::normal_noise(0.3), 2.0, bm::normal(2.0, 0.3), -8.0, 12.0) < 5e-12);
  CHECK(worst(sy::relative_noise(0.15), -2.0, bm::normal(-2.0, 0.3), -8.0, 4.0) < 5e-12);
  CHECK(worst(sy::two_part_noise({.absolute = 0.3, .relative = 0.2}), 2.0, bm::normal(2.0, 0.5), -8.0, 12.0) < 5e-12);
  CHECK(worst(sy::with_offset(sy::normal_noise(0.3), 0.4), 2.0, bm::normal(2.0, 0.5), -8.0, 12.0) < 5e-12);
  for (double const dof : {0.5, 1.0, 4.0, 30.0, 1000.0})
    CHECK(worst(sy::student_noise(1.0, dof), 0.0, bm::students_t(dof), -15.0, 15.0) < 5e-12);
  CHECK(worst(sy::laplace_noise(0.4), -1.0, bm::laplace(-1.0, 0.4), -50.0, 50.0) < 5e-12);
  CHECK(worst(sy::lognormal_noise(0.25), 3.0, bm::lognormal(std::log(3.0), 0.25), 0.01, 100.0) < 5e-12);
  CHECK(worst(sy::uniform_tolerance(0.5), 2.0, bm::uniform(1.5, 2.5), 1.5, 2.5) < 1e-13);
  CHECK(worst(sy::triangular_noise(0.5), 2.0, bm::triangular(1.5, 2.0, 2.5), 1.5, 2.5) < 1e-12);
  CHECK(worst(sy::anywhere(1.5, 2.5), 9.0, bm::uniform(1.5, 2.5), 1.5, 2.5) < 1e-13);
  CHECK(worst(sy::exponential_life(), 0.7, bm::exponential(0.7), 0.0, 200.0) < 5e-12);
}

TEST_CASE("counts agree with Boost.Math") {
  CHECK(worst_count(sy::poisson_count(), 7.3, bm::poisson(7.3), 100) < 5e-13);
  CHECK(worst_count(sy::poisson_count({.background = 1.3, .exposure = 4.0}), 1.5, bm::poisson(7.3), 100) < 5e-13);
  CHECK(worst_count(sy::poisson_count(), 1500.0, bm::poisson(1500.0), 2500) < 1e-11);
  CHECK(worst_count(sy::binomial_count(60), 0.3, bm::binomial(60, 0.3), 60) < 5e-13);
  CHECK(worst_count(sy::binomial_count(1000), 0.02, bm::binomial(1000, 0.02), 150) < 1e-11);
  CHECK(worst_count(sy::negative_binomial_count(2.5), 6.0, bm::negative_binomial(2.5, 2.5 / 8.5), 300) < 5e-12);
  CHECK(worst_count(sy::negative_binomial_count(400.0), 6.0, bm::negative_binomial(400.0, 400.0 / 406.0), 60) < 1e-10);
}

TEST_CASE("negative binomial counts are Poisson counts whose mean is gamma, and Poisson ones for a large size") {
  // P(n) = integral of Poisson(n; m) Gamma(m; size, scale mean / size), by its closed form with Boost's gamma function
  for (int n = 0; n < 60; ++n) {
    double const size = 2.5, mean = 6.0;
    double const exact = bm::lgamma(n + size) - bm::lgamma(n + 1.0) - bm::lgamma(size) +
                         size * std::log(size / (size + mean)) + n * std::log(mean / (size + mean));
    CHECK(sy::negative_binomial_count(size).score(n, mean).value == doctest::Approx(exact).epsilon(1e-13));
    CHECK(sy::negative_binomial_count(1e15).score(n, mean).value ==
          doctest::Approx(sy::poisson_count().score(n, mean).value).epsilon(1e-11));
  }
}

TEST_CASE("a dead time counter without dead time is a Poisson count; with one its law is Feller's") {
  auto const plain = sy::dead_time_counter({.dead_time = 0.0, .counting_time = 3.0, .background = 0.5});
  for (int n = 0; n < 60; ++n)
    CHECK(plain.score(n, 2.0).value == doctest::Approx(sy::poisson_count().score(n, 7.5).value).epsilon(1e-14));
  // k waiting times of rate r and k - 1 dead times fit into T: Boost's gamma distribution
  double const r = 12.0, T = 1.5, tau = 0.04;
  auto const blind = sy::dead_time_counter({.dead_time = tau, .counting_time = T});
  double mean = 0.0, second = 0.0;
  for (int k = 1; k <= 38; ++k) {
    double const live = T - (k - 1) * tau;
    double const fits = live > 0.0 ? bm::cdf(bm::gamma_distribution<>(k, 1.0 / r), live) : 0.0;
    CHECK(std::exp(blind.score(sy::over(k - 1), r).value) == doctest::Approx(fits).epsilon(1e-12));
    mean += fits;
    second += (2.0 * k - 1.0) * fits;
  }
  // T r / (1 + r tau) for a process already running, and what a free start adds: Mueller 1974, from memory, and renewal
  // theory
  double const live = 1.0 + r * tau;
  CHECK(mean == doctest::Approx(T * r / live + 0.5 * std::pow(r * tau / live, 2)).epsilon(1e-6));
  CHECK(second - mean * mean == doctest::Approx(T * r / (live * live * live)).epsilon(0.05));
}

TEST_CASE("hits follow the logistic distribution of Boost.Math, in size or in log size") {
  bm::logistic const linear(2.0, 1.0 / 1.5), logarithmic(std::log(2.0), 1.0 / 1.5);
  for (double const size : {0.01, 0.7, 2.0, 6.0, 19.0}) {
    double const f = 0.03;
    auto const by_size = sy::hit_miss({.half = 2.0, .slope = 1.5, .scale = sy::size_scale::linear, .false_calls = f});
    auto const by_log = sy::hit_miss({.half = 2.0, .slope = 1.5, .scale = sy::size_scale::logarithmic});
    CHECK(std::exp(by_size.score(true, size).value) ==
          doctest::Approx(f + (1.0 - f) * bm::cdf(linear, size)).epsilon(1e-13));
    CHECK(by_size.score(false, size).value ==
          doctest::Approx(std::log((1.0 - f) * bm::cdf(bm::complement(linear, size)))).epsilon(1e-12));
    CHECK(by_log.score(true, size).value ==
          doctest::Approx(std::log(bm::cdf(logarithmic, std::log(size)))).epsilon(1e-12));
  }
  CHECK(sy::hit_miss({.half = 2.0, .slope = 1.5}).score(true, 0.0).value < -1e299);  // no flaw, no hit
  CHECK(sy::hit_miss({.half = 2.0, .slope = 1.5}).score(false, 0.0).value == 0.0);
}

TEST_CASE("labels from one uncertain row: ratios of Boost's beta functions") {
  // class 0 with 12 right of 15, Jeffreys' prior: two more right and one wrong, of three
  auto const grader = sy::label_grader(sy::confusion_counts({{12, 3}, {1, 9}}));
  std::array<int, 3> const truths{0, 0, 0}, labels{0, 1, 0};
  double const exact = std::log(bm::beta(12.5 + 2.0, 3.5 + 1.0) / bm::beta(12.5, 3.5));
  CHECK(grader.score(labels, truths).value == doctest::Approx(exact).epsilon(1e-13));
  CHECK(std::exp(grader.score(0, 0).value) ==
        doctest::Approx(bm::mean(bm::beta_distribution<>(12.5, 3.5))).epsilon(1e-14));
  // an exact matrix makes them independent
  auto const known = sy::label_grader(sy::confusion_matrix({{0.8, 0.2}, {0.1, 0.9}}));
  CHECK(known.score(labels, truths).value == doctest::Approx(std::log(0.8 * 0.2 * 0.8)).epsilon(1e-14));
}

TEST_CASE("rounded and outlying readings are what they are made of") {
  bm::normal const law(2.0, 0.3);
  auto const display = sy::rounded(0.5, sy::normal_noise(0.3));
  CHECK(std::exp(display.score(2.5, 2.0).value) ==
        doctest::Approx(bm::cdf(law, 2.75) - bm::cdf(law, 2.25)).epsilon(1e-13));
  CHECK(std::exp(display.score(sy::under(2.0), 2.0).value) == doctest::Approx(bm::cdf(law, 1.75)).epsilon(1e-13));
  CHECK(std::exp(display.score(sy::over(1.9), 2.0).value) ==
        doctest::Approx(bm::cdf(bm::complement(law, 1.75))).epsilon(1e-13));
  CHECK(std::exp(display.score(sy::within(1.5, 2.0), 2.0).value) ==
        doctest::Approx(bm::cdf(law, 2.25) - bm::cdf(law, 1.25)).epsilon(1e-13));
  auto const clock = sy::rounded_down(0.5, sy::normal_noise(0.3));
  CHECK(std::exp(clock.score(2.0, 2.0).value) == doctest::Approx(bm::cdf(law, 2.5) - bm::cdf(law, 2.0)).epsilon(1e-13));
  auto const tens = sy::rounded(10.0, sy::poisson_count());  // 15 to 24
  bm::poisson const counts(17.0);
  CHECK(std::exp(tens.score(20, 17.0).value) ==
        doctest::Approx(bm::cdf(counts, 24) - bm::cdf(counts, 14)).epsilon(1e-13));
  auto const wild = sy::with_outliers(sy::normal_noise(0.3), 0.02, sy::anywhere(0.0, 50.0));
  CHECK(std::exp(wild.score(2.4, 2.0).value) == doctest::Approx(0.98 * bm::pdf(law, 2.4) + 0.02 / 50.0).epsilon(1e-13));
  CHECK(wild.score(45.0, 2.0).value == doctest::Approx(std::log(0.02 / 50.0)).epsilon(1e-13));
  // contract: a clock in steps of 0.1 with noise of 0.02
  CHECK(std::abs(sy::rounded(0.1, sy::normal_noise(0.02)).score(2.3, 2.30).value -
                 std::log(std::erf(0.05 / 0.02 / std::sqrt(2.0)))) < 1e-14);
}
