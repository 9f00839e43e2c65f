// SPDX-License-Identifier: BSL-1.0
// Moments, correlation and covariance against certified values, Boost.Accumulators,
// closed forms, and error bars written out term by term.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <string>
#include <vector>

#include <boost/accumulators/accumulators.hpp>
#include <boost/accumulators/statistics/stats.hpp>
#include <boost/accumulators/statistics/variates/covariate.hpp>
#include <boost/accumulators/statistics/weighted_covariance.hpp>
#include <boost/accumulators/statistics/weighted_kurtosis.hpp>
#include <boost/accumulators/statistics/weighted_mean.hpp>
#include <boost/accumulators/statistics/weighted_skewness.hpp>
#include <boost/accumulators/statistics/weighted_variance.hpp>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;
using law::itself;

namespace {

sy::likelihood flat(double) { return sy::likelihood{1.0}; }

struct weighted_data {
  std::vector<double> x, w;
};
weighted_data made(std::size_t n, std::uint64_t seed, double centre = 0.0) {
  weighted_data d;
  for (std::size_t i = 0; i < n; ++i) {
    sy::draws draws(seed, i);
    d.x.push_back(centre + draws.exponential(0.7));
    d.w.push_back(draws.exponential(1.0));
  }
  return d;
}
auto weighed(weighted_data const& d) { return sy::weigh(d.x, flat, {.prior_weights = d.w}); }

/// sum u^2 and sum u^4 of u = W influence(x), term by term in long double.
template <class Influence>
void check_error(sy::estimate const& e, weighted_data const& d, Influence influence, double relative = 1e-10) {
  long double total = 0.0L, second = 0.0L, fourth = 0.0L;
  for (double const w : d.w) total += w;
  for (std::size_t i = 0; i < d.x.size(); ++i) {
    long double const u = d.w[i] / total * influence(static_cast<long double>(d.x[i]));
    second += u * u;
    fourth += u * u * u * u;
  }
  long double const n = static_cast<long double>(d.x.size());
  CHECK(close(e.standard_error, static_cast<double>(std::sqrt(second * n / (n - 1.0L))), relative));
  CHECK(close(e.carriers, static_cast<double>(second * second / fourth), relative));
}

}  // namespace

TEST_CASE("moments: certified mean and standard deviation, NIST StRD univariate summary statistics") {
  // https://www.itl.nist.gov/div898/strd/univ/homepage.html
  std::vector<double> first{10000001.0, 10000003.0, 10000002.0}, second{1.2}, third{1000000.2}, fourth{10000000.2};
  for (int i = 0; i < 500; ++i) {
    for (double const x : {1.1, 1.3}) second.push_back(x);
    for (double const x : {1000000.1, 1000000.3}) third.push_back(x);
    for (double const x : {10000000.1, 10000000.3}) fourth.push_back(x);
  }
  auto const moments = [](std::vector<double> const& x, double log_weight) {
    return sy::weigh(x, [log_weight](double) { return sy::log_likelihood{log_weight}; }).moments(itself);
  };
  for (double const shift : {0.0, 700.0, -700.0}) {
    CHECK(close(moments(first, shift).mean.value, 10000002.0, 1e-15));
    CHECK(close(moments(first, shift).sd.value, 1.0, 1e-14));
    CHECK(close(moments(second, shift).mean.value, 1.2, 1e-15));
    CHECK(close(moments(second, shift).sd.value, 0.1, 1e-13));
    CHECK(close(moments(third, shift).mean.value, 1000000.2, 1e-15));
    CHECK(close(moments(third, shift).sd.value, 0.1, 1e-8));
    CHECK(close(moments(fourth, shift).mean.value, 10000000.2, 1e-15));
    CHECK(close(moments(fourth, shift).sd.value, 0.10000000055879354, 1e-13));  // of the inputs as doubles hold them
  }
  // As counts they are the same sample; as weights they share the mean alone.
  std::vector<double> const distinct{1.2, 1.1, 1.3};
  auto const counted = sy::weigh(distinct, flat, {.counts = {1, 500, 500}}).moments(itself);
  CHECK(close(counted.mean.value, 1.2, 1e-15));
  CHECK(close(counted.sd.value, 0.1, 1e-13));
  auto const weighted = sy::weigh(distinct, flat, {.prior_weights = {1.0, 500.0, 500.0}});
  CHECK(close(weighted.moments(itself).mean.value, 1.2, 1e-15));
  CHECK(weighted.diagnosis().effective_size() == doctest::Approx(2.004).epsilon(1e-6));
}

TEST_CASE("moments: Boost.Accumulators agrees on weighted mean, variance, skewness, kurtosis and covariance") {
  namespace acc = boost::accumulators;
  using set = acc::accumulator_set<
      double,
      acc::stats<acc::tag::weighted_mean, acc::tag::weighted_variance, acc::tag::weighted_skewness,
                 acc::tag::weighted_kurtosis, acc::tag::weighted_covariance<double, acc::tag::covariate1>>,
      double>;
  for (std::size_t const n : {3u, 50u, 5000u}) {
    weighted_data const d = made(n, 31);
    set boost;
    for (std::size_t i = 0; i < n; ++i) boost(d.x[i], acc::weight = d.w[i], acc::covariate1 = std::sin(d.x[i]));
    auto const sample = weighed(d);
    auto const m = sample.moments(itself);
    double const kish = sample.diagnosis().effective_size(), factor = kish / (kish - 1.0);
    CHECK(close(m.mean.value, acc::weighted_mean(boost), 1e-12));
    CHECK(close(m.sd.value, std::sqrt(acc::weighted_variance(boost) * factor), 1e-11));
    CHECK(close(m.skewness.value, acc::weighted_skewness(boost), 1e-9));
    CHECK(close(m.kurtosis.value, acc::weighted_kurtosis(boost) + 3.0, 1e-9));  // theirs is the excess over 3
    auto const c = sample.covariance([](double x) { return std::array{x, std::sin(x)}; });
    CHECK(close(c(0, 1).value, acc::weighted_covariance(boost, acc::tag::covariate1()) * factor, 1e-10));
  }
}

TEST_CASE("moments: two points in closed form") {
  // P(1) = p: sd^2 = p q, skewness (q - p) / sqrt(p q), kurtosis (1 - 3 p q) / (p q)
  for (double const p : {0.1, 0.25, 0.7}) {
    double const q = 1.0 - p;
    auto const sample = sy::weigh(std::vector<double>{0.0, 1.0}, flat, {.prior_weights = {q, p}});
    double const kish = 1.0 / (p * p + q * q);
    auto const m = sample.moments(itself);
    CHECK(close(m.mean.value, p, 1e-14));
    CHECK(close(m.sd.value, std::sqrt(p * q * kish / (kish - 1.0)), 1e-13));
    CHECK(close(m.skewness.value, (q - p) / std::sqrt(p * q), 1e-12));
    CHECK(close(m.kurtosis.value, (1.0 - 3.0 * p * q) / (p * q), 1e-12));
  }
  // A readout that does not vary has no shape; and to first order no weights change the kurtosis of a fair coin.
  auto const even = sy::weigh(std::vector<double>(400, 0.0), flat).moments(itself);
  CHECK(even.sd.value == 0.0);
  for (sy::estimate const& e : {even.sd, even.skewness, even.kurtosis}) CHECK(e.verdict() == sy::verdict::broken);
  std::vector<double> coin(400, -1.0);
  for (std::size_t i = 0; i < 200; ++i) coin[i] = 1.0;
  auto const fair = sy::weigh(coin, flat).moments(itself);
  CHECK(close(fair.kurtosis.value, 1.0, 1e-14));
  CHECK(fair.kurtosis.standard_error == 0.0);
  CHECK(fair.kurtosis.verdict() == sy::verdict::broken);
  CHECK(fair.skewness.value == 0.0);
  CHECK(fair.skewness.standard_error == doctest::Approx(2.0 / std::sqrt(399.0)).epsilon(1e-12));  // u = -2 z W
}

TEST_CASE("moments: error bars are those of the influence functions, term by term") {
  for (double const centre : {0.0, -3.0, 1e6}) {
    weighted_data const d = made(3000, 37, centre);
    auto const sample = weighed(d);
    auto const m = sample.moments(itself);
    long double total = 0.0L, mean = 0.0L, m2 = 0.0L, m3 = 0.0L, m4 = 0.0L;
    for (double const w : d.w) total += w;
    for (std::size_t i = 0; i < d.x.size(); ++i) mean += d.w[i] / total * d.x[i];
    for (std::size_t i = 0; i < d.x.size(); ++i) {
      long double const e = d.x[i] - mean, w = d.w[i] / total;
      m2 += w * e * e;
      m3 += w * e * e * e;
      m4 += w * e * e * e * e;
    }
    long double const s = m3 / std::pow(m2, 1.5L), k = m4 / (m2 * m2);
    auto const z = [&](long double x) { return (x - mean) / std::sqrt(m2); };
    double const tight = centre == 1e6 ? 1e-7 : 1e-10;
    check_error(
        m.mean, d, [&](long double x) { return x - mean; }, tight);
    check_error(
        m.sd, d, [&](long double x) { return 0.5L * m.sd.value * (z(x) * z(x) - 1.0L); }, tight);
    check_error(
        m.skewness, d,
        [&](long double x) { return z(x) * z(x) * z(x) - 3.0L * z(x) - s - 1.5L * s * (z(x) * z(x) - 1.0L); }, tight);
    check_error(
        m.kurtosis, d,
        [&](long double x) {
          long double const t = z(x);
          return t * t * t * t - k - 4.0L * s * t - 2.0L * k * (t * t - 1.0L);
        },
        tight);
    auto const r = sample.correlation(itself, [](double x) { return std::cos(x); });
    if (centre == 1e6) continue;  // the cosine of a rounded argument is another function
    long double mc = 0.0L;
    for (std::size_t i = 0; i < d.x.size(); ++i) mc += d.w[i] / total * std::cos(d.x[i]);
    long double vc = 0.0L, xc = 0.0L;
    for (std::size_t i = 0; i < d.x.size(); ++i) {
      long double const w = d.w[i] / total, e = std::cos(d.x[i]) - mc;
      vc += w * e * e;
      xc += w * e * (d.x[i] - mean);
    }
    long double const rho = xc / std::sqrt(vc * m2);
    CHECK(close(r.value, static_cast<double>(rho), 1e-11));
    check_error(
        r, d,
        [&](long double x) {
          long double const a = z(x), b = (std::cos(static_cast<double>(x)) - mc) / std::sqrt(vc);
          return a * b - 0.5L * rho * (a * a + b * b);
        },
        1e-9);
    auto const c = sample.covariance([](double x) { return std::array{x, std::cos(x)}; });
    double const kish = sample.diagnosis().effective_size();
    check_error(
        c(0, 1), d,
        [&](long double x) {
          return ((x - mean) * (std::cos(static_cast<double>(x)) - mc) - xc) * (kish / (kish - 1.0));
        },
        1e-9);
  }
}

TEST_CASE("moments: one value far off leaves nothing overflowed or lost") {
  weighted_data d = made(2000, 41);
  d.x[700] = 1e30;
  d.w[700] = 1e-300;
  weighted_data without = d;
  without.x.erase(without.x.begin() + 700);
  without.w.erase(without.w.begin() + 700);
  auto const a = weighed(d).moments(itself), b = weighed(without).moments(itself);
  CHECK(close(a.mean.value, b.mean.value, 1e-12));
  // its share of the second moment is 1e60 * 1e-303
  CHECK(close(a.sd.value, b.sd.value, 1e-12));
  auto const huge = sy::weigh(made(500, 43).x, flat).moments([](double x) { return 1e60 * x; });
  auto const usual = sy::weigh(made(500, 43).x, flat).moments(itself);
  CHECK(close(huge.kurtosis, usual.kurtosis, 1e-9));
  CHECK(close(huge.sd.standard_error, 1e60 * usual.sd.standard_error, 1e-9));
}

TEST_CASE("correlation: Anscombe's first set, and its error interval stays within one") {
  // Anscombe, The American Statistician 27, 1973, 17 (data and r = 0.816 from memory)
  struct pair {
    double x, y;
  };
  std::vector<pair> const set{{10, 8.04}, {8, 6.95}, {13, 7.58},  {9, 8.81}, {11, 8.33}, {14, 9.96},
                              {6, 7.24},  {4, 4.26}, {12, 10.84}, {7, 4.82}, {5, 5.68}};
  auto const r = sy::weigh(set, [](pair const&) { return sy::likelihood{1.0}; }).correlation(&pair::x, &pair::y);
  CHECK(r.value == doctest::Approx(0.816421).epsilon(1e-6));
  for (double const level : {0.5, 0.95, 0.999}) {
    sy::interval const limits = r.error_interval(level);
    CHECK(limits.lower > -1.0);
    CHECK(limits.lower < r.value);
    CHECK(limits.upper > r.value);
    CHECK(limits.upper < 1.0);
  }
  // Symmetric in atanh r, the linear interval to first order.
  sy::interval const narrow = r.error_interval(0.01);
  CHECK(std::atanh(narrow.upper) + std::atanh(narrow.lower) ==
        doctest::Approx(2.0 * std::atanh(r.value)).epsilon(1e-10));
  CHECK(narrow.upper - narrow.lower ==
        doctest::Approx(static_cast<sy::estimate const&>(r).error_interval(0.01).upper * 2.0 - 2.0 * r.value)
            .epsilon(1e-3));
}

TEST_CASE("correlation: exactly one, and undefined where a readout does not vary") {
  std::vector<double> const x{1.0, 2.0, 4.0, 8.0, 16.0};
  auto const sample = sy::weigh(x, flat);
  auto const up = sample.correlation(itself, [](double v) { return 2.0 * v; });
  CHECK(up.value == doctest::Approx(1.0).epsilon(1e-15));
  CHECK(up.standard_error == 0.0);
  CHECK(up.verdict() == sy::verdict::broken);
  CHECK(sample.correlation(itself, [](double v) { return -v; }).value == doctest::Approx(-1.0).epsilon(1e-15));
  auto const none = sample.correlation(itself, [](double) { return 3.0; });
  CHECK(none.value == 0.0);
  CHECK(none.verdict() == sy::verdict::broken);
  CHECK_FALSE(none.error_interval(0.9).lower_known);
}

TEST_CASE("covariance: sixteen numbers at once, each entry as if asked alone") {
  weighted_data const d = made(4000, 47);
  auto const sample = weighed(d);
  auto const all = [](double x) {
    std::array<double, 16> a{};
    for (std::size_t k = 0; k < a.size(); ++k)
      a[k] = std::sin(static_cast<double>(k + 1) * x) + 0.1 * static_cast<double>(k) * x;
    return a;
  };
  auto const c = sample.covariance(all);
  for (std::size_t i = 0; i < 16; i += 3)
    for (std::size_t j = 0; j < 16; j += 5) {
      auto const two = sample.covariance([&](double x) { return std::array{all(x)[i], all(x)[j]}; });
      CHECK(close(c(i, j), two(0, 1), 1e-11));
      CHECK(close(c(i, j), c(j, i), 0.0));
      CHECK(close(c.correlation(i, j).value, two.correlation(1, 0).value, 1e-11));
    }
  CHECK(law::holds(law::said<sy::bad_argument>([&] { c(16, 0); }), "there is no entry (16, 0) in a matrix of 16 rows"));
  // The covariance of Monte Carlo errors is another thing: smaller by about the effective size.
  CHECK(sample.expectation(all).covariance(2, 5) / c(2, 5).value ==
        doctest::Approx(1.0 / sample.diagnosis().effective_size()).epsilon(0.3));
}

TEST_CASE("moments: NaN is refused with its sample, and zero weight may carry one") {
  std::vector<double> const x{1.0, law::not_a_number(), 3.0, 5.0};
  auto const aside = sy::weigh(x, flat, {.prior_weights = {1.0, 0.0, 1.0, 1.0}});
  CHECK(aside.moments(itself).mean.value == doctest::Approx(3.0));
  CHECK(law::holds(law::said<sy::bad_readout>([&] { sy::weigh(x, flat).moments(itself); }), "sample 1 is NaN"));
}

TEST_CASE("moments: text rounds to two digits of the error") {
  std::string const text = to_string(weighed(made(1000, 53)).moments(itself));
  for (char const* const word : {"mean ", "sd ", "skewness ", "kurtosis ", "+-"}) CHECK(law::holds(text, word));
}
