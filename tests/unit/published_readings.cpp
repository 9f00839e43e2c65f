// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Published readings with exact posteriors: draws from the prior, weighed by lambdas
// that keep every constant, against closed forms, within 5 reported standard errors.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <vector>

#include <boost/math/distributions/gamma.hpp>

#include <steelyard/core.hpp>

#include "law_questions.hpp"
#include "published_data.hpp"

namespace sy = steelyard;
using law::errors_off;

namespace {

struct known {
  double mean, sd, low, median, high, log_evidence;
};

template <class X>
void check(sy::weighted_sample<X> const& sample, known const& exact) {
  auto const [mean, moments, low, median, high, evidence] =
      sample.estimate(sy::expectation(law::itself), sy::moments(law::itself), sy::quantile(law::itself, 0.025),
                      sy::quantile(law::itself, 0.5), sy::quantile(law::itself, 0.975), sy::log_evidence());
  CHECK(mean.verdict() == sy::verdict::sound);
  CHECK(errors_off(mean, exact.mean) < 5.0);
  CHECK(errors_off(moments.sd, exact.sd) < 5.0);
  CHECK(errors_off(low, exact.low) < 5.0);
  CHECK(errors_off(median, exact.median) < 5.0);
  CHECK(errors_off(high, exact.high) < 5.0);
  CHECK(errors_off(evidence, exact.log_evidence) < 5.0);
  CHECK(mean.standard_error < 0.2 * exact.sd);
  CHECK(evidence.standard_error < 0.2);
}

/// Log-likelihood of counts under Poisson(lambda), from a table of how often each was seen.
auto poisson(published::table const& t, char const* count, char const* times) {
  return [counts = t.numbers(count), times_seen = t.numbers(times)](double lambda) {
    double sum = 0.0;
    for (std::size_t k = 0; k < counts.size(); ++k)
      sum += times_seen[k] * (counts[k] * std::log(lambda) - lambda - std::lgamma(counts[k] + 1.0));
    return sy::log_likelihood{sum};
  };
}
auto gamma_prior(double shape, double rate) {
  return [law = boost::math::gamma_distribution<double>(shape, 1.0 / rate)](sy::draws& draws) { return draws.from(law); };
}
auto normal_reading(std::vector<double> const& read, double sigma) {
  return [read, sigma](double mu) {
    double sum = 0.0;
    for (double const x : read) sum += -0.5 * (x - mu) * (x - mu) / (sigma * sigma);
    return sy::log_likelihood{sum - static_cast<double>(read.size()) * (std::log(sigma) + 0.91893853320467274178)};
  };
}

}  // namespace

TEST_CASE("Rutherford & Geiger 1910: alpha particles in 2608 intervals") {
  // Phil. Mag. ser. 6, 20, 698; prior Gamma(2, rate 0.5), posterior Gamma(2 + 10097, 0.5 + 2608).
  auto const table = published::read("rutherford_geiger_1910.csv");
  sy::pipeline const problem{gamma_prior(2.0, 0.5), poisson(table, "count", "intervals")};
  auto const sample = problem.run({.size = 200'000, .seed = 1});
  check(sample, {3.87157370136094, 0.0385255054253799, 3.79642885417, 3.87144591475, 3.94744474844, -5356.410927390413});
  // E w^2 / (E w)^2 = 52.4248145073 and KL(posterior || prior) = 3.80599890954: what the weights are worth.
  auto const& health = sample.diagnosis();
  CHECK(std::abs(health.effective_size() / 200'000 * 52.4248145073 - 1.0) < 0.08);
  CHECK(std::abs(std::log(health.perplexity() / 200'000) + 3.80599890954) < 0.08);
  // A rare event inside the posterior, P(lambda > 4) = 0.000482: the sample's size says nothing about it, its verdict does.
  auto const rare = sample.probability([](double lambda) { return lambda > 4.0; });
  CHECK(errors_off(rare, 0.000482245374895) < 5.0);
  sy::interval const doubt = rare.error_interval(0.999999);
  CHECK(doubt.lower < 0.000482245374895);
  CHECK(doubt.upper > 0.000482245374895);
}

TEST_CASE("Bortkiewicz 1898: deaths by horse kicks in 280 corps-years") {
  // Prior Gamma(2, rate 2), posterior Gamma(2 + 196, 2 + 280).
  auto const table = published::read("horsekicks_280.csv");
  sy::pipeline const problem{gamma_prior(2.0, 2.0), poisson(table, "deaths", "corps_years")};
  check(problem.run({.size = 100'000, .seed = 1}),
        {0.702127659574468, 0.0498980399981216, 0.607730067033, 0.7009459809, 0.803240205169, -316.6053793143109});
}

TEST_CASE("Freireich 1963, Gehan 1965: remission under 6-MP, censored and exponential") {
  // 9 events in 359 weeks, prior Gamma(1, rate 10), posterior Gamma(10, 369).
  auto const table = published::read("gehan_leukaemia.csv");
  std::vector<double> weeks, ended;
  auto const treatment = table.words("treat");
  for (std::size_t i = 0; i < treatment.size(); ++i)
    if (treatment[i] == "6-MP") {
      weeks.push_back(table.numbers("time")[i]);
      ended.push_back(table.numbers("cens")[i]);
    }
  CHECK(weeks.size() == 21);
  auto const censored = [&](double rate) {
    double sum = 0.0;
    for (std::size_t i = 0; i < weeks.size(); ++i) sum += ended[i] * std::log(rate) - rate * weeks[i];
    return sy::log_likelihood{sum};
  };
  sy::pipeline const problem{gamma_prior(1.0, 10.0), censored};
  auto const sample = problem.run({.size = 100'000, .seed = 1});
  boost::math::gamma_distribution<double> const posterior(10.0, 1.0 / 369.0);
  check(sample, {0.02710027100271, 0.00856985815763789, 0.0129956333229, boost::math::quantile(posterior, 0.5), 0.0463002803561,
                 -44.0035538673297566});
}

TEST_CASE("Michelson 1879: the speed of light, all 100 runs, sigma 79 known") {
  // morley.csv, km/s less 299 000; prior N(800, 100^2).
  auto const speeds = published::read("morley.csv").numbers("Speed");
  CHECK(speeds.size() == 100);
  sy::pipeline const problem{[](sy::draws& d) { return d.normal(800.0, 100.0); }, normal_reading(speeds, 79.0)};
  double const z = 1.959963984540054, mean = 852.074999925465, sd = 7.8754628427517;
  check(problem.run({.size = 100'000, .seed = 1}), {mean, sd, mean - z * sd, mean, mean + z * sd, -581.029712331705879});
}

namespace {

/// Likelihood of readings that were rounded to `step`.
auto rounded_reading(std::vector<double> const& read, double step, double sigma) {
  return [=](double mu) {
    double sum = 0.0;
    for (double const x : read) {
      double const a = (x - 0.5 * step - mu) / sigma / std::sqrt(2.0), b = (x + 0.5 * step - mu) / sigma / std::sqrt(2.0);
      sum += std::log(a > 0.0 ? 0.5 * (std::erfc(a) - std::erfc(b)) : 0.5 * (std::erfc(-b) - std::erfc(-a)));
    }
    return sy::log_likelihood{sum};
  };
}

}  // namespace

TEST_CASE("Michelson 1879, experiment 1: rounded readings are intervals") {
  // Prior N(850, 100^2), sigma 79; recorded to 10 km/s, exact by quadrature of the interval likelihood.
  auto const table = published::read("morley.csv");
  std::vector<double> speeds;
  auto const experiment = table.numbers("Expt"), all = table.numbers("Speed");
  for (std::size_t i = 0; i < all.size(); ++i)
    if (experiment[i] == 1.0) speeds.push_back(all[i]);
  auto const prior = [](sy::draws& d) { return d.normal(850.0, 100.0); };
  auto const sample = sy::pipeline{prior, rounded_reading(speeds, 10.0, 79.0)}.run({.size = 200'000, .seed = 1});
  auto const moments = sample.moments(law::itself);
  CHECK(errors_off(moments.mean, 907.212254920828) < 5.0);
  CHECK(errors_off(moments.sd, 17.406858792707) < 5.0);
  CHECK(errors_off(sample.log_evidence(), -78.382639745722) < 5.0);

  // The same recorded to 100, ties to even: taken as exact they give 908.184 +- 17.396 in closed form; as intervals a
  // wider answer, found here by Simpson's rule.
  std::vector<double> coarse;
  for (double const x : speeds) coarse.push_back(100.0 * std::nearbyint(x / 100.0));
  auto const plain = sample.reweigh(normal_reading(coarse, 79.0)).moments(law::itself);
  CHECK(errors_off(plain.mean, 908.184357135584) < 5.0);
  CHECK(errors_off(plain.sd, 17.395607033650) < 5.0);
  auto const interval = rounded_reading(coarse, 100.0, 79.0);
  double top = interval(910.0).value, sum = 0.0, first = 0.0, second = 0.0;
  for (int i = 0; i <= 4000; ++i) {
    double const mu = 710.0 + 0.1 * i, z = (mu - 850.0) / 100.0;
    double const w = (i == 0 || i == 4000 ? 1.0 : i % 2 == 1 ? 4.0 : 2.0) * std::exp(interval(mu).value - top - 0.5 * z * z);
    sum += w;
    first += w * (mu - 910.0);
    second += w * (mu - 910.0) * (mu - 910.0);
  }
  double const sd = std::sqrt(second / sum - first / sum * (first / sum));
  auto const right = sample.reweigh(interval).moments(law::itself);
  CHECK(errors_off(right.mean, 910.0 + first / sum) < 5.0);
  CHECK(errors_off(right.sd, sd) < 5.0);
  CHECK(errors_off(right.sd, 17.395607033650) > 5.0);  // the check tells the two likelihoods apart
}

TEST_CASE("Laplace's Paris births: a probability of 1e-42 on a grid, in logarithms throughout") {
  // Girls 241 945, boys 251 527 (from memory; the exact value is of these numbers): uniform prior,
  // P(share of girls >= 1/2) = 1.1460584901553381e-42.
  double const girls = 241945.0, boys = 251527.0;
  std::vector<double> grid;  // midpoints of cells with an edge at 1/2; the likelihood falls by e in 5e-5 there
  for (int i = -30'000; i < 30'000; ++i) grid.push_back(0.5 + (i + 0.5) * 1e-6);
  auto const births = [&](double p) { return sy::log_likelihood{girls * std::log(p) + boys * std::log1p(-p)}; };
  auto const sample = sy::weigh(grid, births);
  CHECK(sample.log_weights()[0] < -3e5);
  auto const tail = sample.probability([](double p) { return p >= 0.5; });
  CHECK(std::abs(tail.value / 1.1460584901553381e-42 - 1.0) < 1e-4);  // the midpoint rule itself: (1e-6 / 5.2e-5)^2 / 24
  auto const halves = sample.histogram(law::itself, sy::bins({0.47, 0.5, 0.53}));
  CHECK(law::close(halves.probability(1).value, tail.value, 1e-10));
  // The mean of Beta(girls + 1, boys + 1), and its evidence: log B(girls + 1, boys + 1) - log 0.06 for the grid's width.
  CHECK(std::abs(sample.expectation(law::itself).value - (girls + 1.0) / (girls + boys + 2.0)) < 1e-12);
  double const log_beta = std::lgamma(girls + 1.0) + std::lgamma(boys + 1.0) - std::lgamma(girls + boys + 2.0);
  CHECK(std::abs(sample.log_evidence().value - (log_beta - std::log(0.06))) < 1e-7);
}
