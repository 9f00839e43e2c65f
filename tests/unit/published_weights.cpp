// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Published figures about weights: effective sizes, the variance and bias of a
// self-normalised mean, histogram and quantile conventions.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::close;
using law::errors_off;

namespace {

sy::likelihood by_number(double x) { return sy::likelihood{x}; }
std::vector<double> one_to(int n) {
  std::vector<double> all;
  for (int i = 1; i <= n; ++i) all.push_back(i);
  return all;
}

}  // namespace

TEST_CASE("Kish, Survey Sampling, 1965: effective size (sum w)^2 / sum w^2; perplexity exp(-sum W ln W)") {
  auto const sample = sy::weigh(one_to(10), by_number);
  CHECK(close(sample.diagnosis().effective_size(), 7.857142857142857, 1e-14));
  CHECK(close(sample.diagnosis().perplexity(), 8.595868842128647, 1e-14));
  CHECK(close(sample.diagnosis().largest_share(), 10.0 / 55.0, 1e-14));
  for (double const c : {-1e5, 700.0, 1e5}) {
    auto const far = sy::weigh(one_to(10), [c](double x) { return sy::log_likelihood{c + std::log(x)}; });
    CHECK(close(far.diagnosis().effective_size(), 7.857142857142857, 1e-10));
    CHECK(close(far.diagnosis().perplexity(), 8.595868842128647, 1e-10));
  }
}

TEST_CASE("Owen 2013, ch. 9: variance of self-normalised means, prior N(0, 1), one reading y with sd s") {
  // n var = n se^2: what the standard error of a large run must show, up to 1 / sqrt(carriers).
  struct known {
    double y, s, mean, sd, ratio, mean_variance, tail_variance, log_evidence, kl;
  };
  known const cases[] = {
      {0, 1, 0.0, 0.707106781187, 1.15470053837925, 0.384900179459751, 0.288675134594813, -1.26551212348465, 0.0965735902799727},
      {1, 1, 0.5, 0.707106781187, 1.3641175047559, 0.492597987828518, 0.341029376188974, -1.51551212348465, 0.221573590279973},
      {3, 0.5, 2.4, 0.4472135955, 40.8875503285156, 7.45062028208506, 10.2218875821289, -4.63051030886178, 3.28471895621705}};
  std::uint64_t seed = 0;
  for (known const& exact : cases) {
    CAPTURE(exact.y);
    auto const weighter = [&](double x) {
      double const z = (exact.y - x) / exact.s;
      return sy::log_likelihood{-0.5 * z * z - std::log(exact.s) - 0.91893853320467274178};
    };
    double const n = 400'000;
    sy::pipeline const problem{law::draw_normal, weighter};
    auto const answers = problem.estimate({.size = 400'000, .seed = ++seed}, sy::moments(law::itself),
                                          sy::probability([&](double x) { return x > exact.mean; }), sy::log_evidence());
    auto const& [moments, tail, evidence] = answers;
    auto const same = [&](sy::estimate const& e, double variance) {
      CHECK(std::abs(n * e.standard_error * e.standard_error / variance - 1.0) < 5.0 / std::sqrt(e.carriers));
    };
    CHECK(errors_off(moments.mean, exact.mean) < 5.0);
    CHECK(errors_off(moments.sd, exact.sd) < 5.0);
    CHECK(errors_off(tail, 0.5) < 5.0);
    CHECK(errors_off(evidence, exact.log_evidence) < 5.0);
    same(moments.mean, exact.mean_variance);
    same(tail, exact.tail_variance);
    same(evidence, exact.ratio - 1.0);  // var log Z = (E w^2 / (E w)^2 - 1) / n
    CHECK(std::abs(n / answers.diagnosis().effective_size() / exact.ratio - 1.0) < 5.0 / std::sqrt(evidence.carriers));
    CHECK(std::abs(std::log(answers.diagnosis().perplexity() / n) + exact.kl) < 5.0 / std::sqrt(evidence.carriers));
  }
}

TEST_CASE("Owen 2013, ch. 9: the bias of a self-normalised mean is about -E[w^2 (f - mu)] / (n (E w)^2)") {
  // y = 1, s = 1: n bias -0.227352917459316, n var 0.492597987828518; over 40 000 runs of 50 samples.
  int const runs = 40'000, n = 50;
  sy::pipeline const problem{law::draw_normal, law::read_one};
  double sum = 0.0;
  for (int seed = 1; seed <= runs; ++seed) sum += problem.expectation({.size = n, .seed = seed}, law::itself).value - 0.5;
  double const bias = sum / runs, error = std::sqrt(0.492597987828518 / n / runs);
  CHECK(std::abs(n * bias + 0.227352917459316) < 5.0 * n * error);
  CHECK(std::abs(bias) > 5.0 * error);  // enough runs to see it
}

TEST_CASE("histogram conventions: closed left, open right, last bin closed on both sides, and what lies outside is kept") {
  // numpy's rule for edges: x = (.5 1.5 1.5 2.5 3 -1), w = (1 2 3 4 5 7), edges 0 1 2 3: sums 1, 5, 9.
  struct point {
    double x, w;
  };
  std::vector<point> const points{{0.5, 1.0}, {1.5, 2.0}, {1.5, 3.0}, {2.5, 4.0}, {3.0, 5.0}, {-1.0, 7.0}};
  auto const sample = sy::weigh(points, [](point const& p) { return sy::likelihood{p.w}; });
  for (sy::bins const& edges : {sy::equal_bins(0.0, 3.0, 3), sy::bins({0.0, 1.0, 2.0, 3.0})}) {
    auto const h = sample.histogram(&point::x, edges);
    CHECK(close(h.probability(0).value, 1.0 / 22.0, 1e-14));
    CHECK(close(h.probability(1).value, 5.0 / 22.0, 1e-14));
    CHECK(close(h.probability(2).value, 9.0 / 22.0, 1e-14));
    CHECK(close(h.below().value, 7.0 / 22.0, 1e-14));
    CHECK(h.above().value == 0.0);
    CHECK(h.not_a_number().value == 0.0);
    CHECK(close(h.density(1).value, 5.0 / 22.0, 1e-14));  // so the density integrates to the share inside, 15/22
    CHECK(close(h.probability_inside(0).value, 1.0 / 15.0, 1e-14));
    CHECK(close(h.probability_inside(1).value, 1.0 / 3.0, 1e-14));
    CHECK(close(h.probability_inside(2).value, 9.0 / 15.0, 1e-14));
    // sqrt(sum W^2 (1_b - p)^2) = 0.2154524381073924 for that bin, in range only; here times n / (n - 1) of six samples.
    CHECK(close(h.probability_inside(1).standard_error, 0.2154524381073924 * std::sqrt(6.0 / 5.0), 1e-13));
  }
}

TEST_CASE("quantile: inf{x : F(x) >= p}, equal to R's quantile(rep(1:10, 1:10), type = 1)") {
  auto const sample = sy::weigh(one_to(10), by_number);
  struct known {
    double p, value;
  };
  for (auto const& [p, value] : {known{0.1, 3.0}, known{0.25, 5.0}, known{0.5, 7.0}, known{0.75, 9.0}, known{0.9, 10.0}})
    CHECK(sample.quantile(law::itself, p).value == value);
  // At a step of F itself: F(4) = 10/55, and a hair above it.
  CHECK(sample.quantile(law::itself, 10.0 / 55.0).value == 4.0);
  CHECK(sample.quantile(law::itself, 10.0 / 55.0 + 1e-12).value == 5.0);
}

TEST_CASE("Woodruff, JASA 47, 1952, 635: limits of a median") {
  // Same data, median 7: F 0.509090909091 with se 0.1792881826607; p -+ 1.96 se of F leads to [4, 10].
  auto const sample = sy::weigh(one_to(10), by_number);
  auto const median = sample.quantile(law::itself, 0.5);
  CHECK(median.value == 7.0);
  CHECK(close(median.cumulative().value, 0.509090909091, 1e-11));
  CHECK(close(median.cumulative().standard_error, 0.1792881826607 * std::sqrt(10.0 / 9.0), 1e-11));
  double const reach = 1.96 * 0.1792881826607;
  CHECK(sample.quantile(law::itself, 0.5 - reach).value == 4.0);
  CHECK(sample.quantile(law::itself, 0.5 + reach).value == 10.0);
  // Ten values of unlike weights are few: with Student's t the limits at 95 % are no narrower, or open.
  sy::interval const limits = median.error_interval(0.95);
  CHECK((!limits.lower_known || limits.lower <= 4.0));
  CHECK((!limits.upper_known || limits.upper >= 10.0));
  // A level at which t sqrt(10/9) is 1.96 or less for each end's degrees of freedom gives limits within [4, 10].
  sy::interval const narrow = median.error_interval(0.6);
  CHECK(narrow.lower_known);
  CHECK(narrow.upper_known);
  CHECK(narrow.lower >= 4.0);
  CHECK(narrow.upper <= 10.0);
}
