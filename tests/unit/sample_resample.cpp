// SPDX-License-Identifier: BSL-1.0
// Resampling a kept sample: schemes with their exact variances, ensembles as ranges,
// shared states, and error bars that hold both sources of error.

#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <iterator>
#include <memory>
#include <numeric>
#include <ranges>
#include <span>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;
using law::said;

namespace {

sy::likelihood by_number(double x) { return sy::likelihood{x + 1.0}; }
std::vector<double> const four{0.0, 1.0, 2.0, 3.0};  // weights .1 .2 .3 .4, f = state

/// Mean and variance of the mean of `f` over k slots, over many seeds.
struct spread {
  double mean = 0.0, variance = 0.0;
};
template <class Sample, class F>
spread over_seeds(Sample const& sample, std::size_t k, sy::scheme how, int seeds, F f) {
  std::vector<double> means;
  for (int seed = 1; seed <= seeds; ++seed) {
    double sum = 0.0;
    auto const chosen = sample.resample(k, {.seed = seed, .scheme = how});
    for (auto const& each : chosen) sum += f(each);
    means.push_back(sum / static_cast<double>(k));
  }
  spread s;
  for (double const m : means) s.mean += m / seeds;
  for (double const m : means) s.variance += (m - s.mean) * (m - s.mean) / (seeds - 1);
  return s;
}

}  // namespace

TEST_CASE("exact variances of the mean: four draws from W = (.1 .2 .3 .4), f = (0 1 2 3)") {
  // Douc, Cappe & Moulines, Comparison of resampling schemes for particle filtering, 2005; worked out for this case:
  // multinomial 0.25, residual 0.15625, stratified 0.04, systematic 0.1; all unbiased, mean 2.
  auto const sample = sy::weigh(four, by_number);
  struct known {
    sy::scheme how;
    double variance;
  };
  std::vector<double> const weights{0.1, 0.2, 0.3, 0.4};
  for (known const& one : {known{sy::scheme::multinomial, 0.25}, known{sy::scheme::residual, 0.15625},
                                      known{sy::scheme::stratified, 0.04}, known{sy::scheme::systematic, 0.1}}) {
    sy::scheme const how = one.how;
    double const variance = one.variance;
    CAPTURE(static_cast<int>(how));
    CHECK(close(sy::detail::resampling_variance(how, weights, four, 4), variance, 1e-12));
    auto const seen = over_seeds(sample, 4, how, 8000, law::itself);
    CHECK(std::abs(seen.mean - 2.0) < 5.0 * std::sqrt(variance / 8000));
    CHECK(std::abs(seen.variance - variance) < 5.0 * variance * std::sqrt(2.0 / 8000) * 1.5);  // kurtosis at most 3.5 here
  }
}

TEST_CASE("the counter-example: systematic draws can be worse than independent ones") {
  // Douc, Cappe & Moulines 2005: N = 2, four items of 1/4, f = (1 0 1 0): multinomial 0.125, systematic 0.25.
  std::vector<double> const equal(4, 0.25), f{1.0, 0.0, 1.0, 0.0};
  CHECK(close(sy::detail::resampling_variance(sy::scheme::systematic, equal, f, 2), 0.25, 1e-12));
  CHECK(close(sy::detail::resampling_variance(sy::scheme::multinomial, equal, f, 2), 0.125, 1e-12));
  auto const sample = sy::weigh(f, [](double) { return sy::likelihood{1.0}; });
  CHECK(std::abs(over_seeds(sample, 2, sy::scheme::systematic, 4000, law::itself).variance - 0.25) < 0.001);  // 0 or 1
  CHECK(std::abs(over_seeds(sample, 2, sy::scheme::multinomial, 4000, law::itself).variance - 0.125) < 5.0 * 0.125 / std::sqrt(4000));
}

TEST_CASE("systematic: copies differ from k W by less than one") {
  sy::draws draws(1);
  std::vector<double> states;
  for (int i = 0; i < 500; ++i) states.push_back(draws.exponential(1.0));
  auto const sample = sy::weigh(states, by_number);
  double total = 0.0;
  for (double const x : states) total += x + 1.0;
  for (std::size_t const k : {1u, 7u, 100u, 500u, 5000u}) {
    auto const chosen = sample.resample(k, {.seed = 2});
    CHECK(chosen.size() == k);
    std::vector<double> copies(states.size());
    for (auto const& [i, m] : chosen.copies()) copies[i] = static_cast<double>(m);
    CHECK(std::accumulate(copies.begin(), copies.end(), 0.0) == static_cast<double>(k));
    for (std::size_t i = 0; i < states.size(); ++i)
      CHECK(std::abs(copies[i] - static_cast<double>(k) * (states[i] + 1.0) / total) < 1.0);
  }
}

TEST_CASE("shuffled slots are the unshuffled ones in another order; unshuffled ones rise") {
  auto const sample = sy::weigh(four, by_number);
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified, sy::scheme::residual}) {
    auto const plain = sample.resample(1000, {.seed = 3, .scheme = how, .shuffled = false});
    auto const mixed = sample.resample(1000, {.seed = 3, .scheme = how});
    CHECK(std::is_sorted(plain.indices().begin(), plain.indices().end()));
    CHECK(!std::is_sorted(mixed.indices().begin(), mixed.indices().end()));
    CHECK((plain.copies() == mixed.copies()));
    // Any part of a shuffled ensemble is a fair sample: its first hundred have mean 2 too.
    double mean = 0.0;
    for (std::size_t s = 0; s < 100; ++s) mean += mixed[s] / 100.0;
    CHECK(std::abs(mean - 2.0) < 5.0 * std::sqrt(1.0 / 100.0));
  }
}

TEST_CASE("the same seed gives the same slots, another seed others") {
  auto const sample = sy::weigh(four, by_number);
  auto const slots = [&](std::uint64_t seed) {
    auto const chosen = sample.resample(50, {.seed = seed, .scheme = sy::scheme::multinomial});
    return std::vector<std::size_t>(chosen.indices().begin(), chosen.indices().end());
  };
  CHECK(slots(1) == slots(1));
  CHECK(slots(1) != slots(2));
}

TEST_CASE("an ensemble is a random-access range of the states") {
  using range = sy::ensemble<double>;
  static_assert(std::random_access_iterator<range::iterator>);
  static_assert(std::ranges::random_access_range<range const>);
  static_assert(std::ranges::sized_range<range const>);
  static_assert(std::is_same_v<std::iter_reference_t<range::iterator>, double const&>);
  auto const chosen = sy::weigh(four, by_number).resample(10, {.seed = 4, .shuffled = false});
  auto it = chosen.begin();
  CHECK(chosen.end() - chosen.begin() == 10);
  CHECK(*it++ == chosen[0]);
  CHECK(*it == chosen[1]);
  CHECK(*--it == chosen[0]);
  CHECK(it[9] == chosen[9]);
  CHECK(*(it + 3) == chosen[3]);
  CHECK(*(3 + it) == chosen[3]);
  CHECK(*(chosen.end() - 1) == chosen[9]);
  CHECK(it.operator->() == &chosen[0]);
  it += 4;
  it -= 1;
  CHECK(*it-- == chosen[3]);
  CHECK(it < chosen.end());
  CHECK((it <=> chosen.begin()) > 0);
  CHECK(std::accumulate(chosen.begin(), chosen.end(), 0.0) == doctest::Approx(20.0).epsilon(0.3));
  CHECK(std::ranges::max(chosen) == 3.0);
  CHECK(std::is_sorted(chosen.begin(), chosen.end()));
}

TEST_CASE("slots refer to the sample's own states, which outlive the sample") {
  struct huge_state {
    explicit huge_state(double v) : x(std::make_unique<double>(v)) {}
    std::unique_ptr<double> x;
  };
  std::vector<huge_state> states;
  for (double const x : four) states.emplace_back(x);
  huge_state const* const first = states.data();
  auto const chosen = sy::weigh(std::move(states), [](huge_state const& s) { return by_number(*s.x); }).resample(8, {.seed = 5});
  for (std::size_t s = 0; s < chosen.size(); ++s) CHECK(&chosen[s] == first + chosen.indices()[s]);
}

TEST_CASE("from streams alone: states are made again once each, and are the kept ones") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const kept = problem.run({.size = 3000, .seed = 6});
  auto const streams = problem.run({.size = 3000, .seed = 6, .keep = sy::keeping::streams});
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial}) {
    auto const a = kept.resample(400, {.seed = 7, .scheme = how}), b = streams.resample(400, {.seed = 7, .scheme = how});
    for (std::size_t s = 0; s < 400; ++s) {
      CHECK(a.indices()[s] == b.indices()[s]);
      CHECK(a[s] == b[s]);
    }
    CHECK((law::bits(a.expectation(law::itself)) == law::bits(b.expectation(law::itself))));
  }
}

TEST_CASE("an estimate on a resampled ensemble adds the resampling variance to the parent's") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const sample = problem.run({.size = 5000, .seed = 8});
  auto const parent = sample.expectation(law::itself);
  std::vector<double> const weights = sy::detail::plain_weights(sample);
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified, sy::scheme::residual}) {
    CAPTURE(static_cast<int>(how));
    auto const mean = sample.resample(500, {.seed = 9, .scheme = how}).expectation(law::itself);
    double const added = sy::detail::resampling_variance(how, weights, sample.states(), 500);
    CHECK(close(mean.standard_error * mean.standard_error, parent.standard_error * parent.standard_error + added, 1e-9));
    CHECK(law::errors_off(mean, 0.5) < 5.0);
    CHECK(mean.verdict() == sy::verdict::sound);
    auto const tail = sample.resample(500, {.seed = 9, .scheme = how}).probability(law::above_one);
    CHECK(law::errors_off(tail, 0.5 * std::erfc(0.5 / std::sqrt(0.5) / std::sqrt(2.0))) < 5.0);
    CHECK(tail.standard_error >= sample.probability(law::above_one).standard_error);
  }
  CHECK(sample.resample(500, {.seed = 10}).probability([](double x) { return x > 50.0; }).never_seen());
}

TEST_CASE("the error bar of an ensemble over many seeds: mean z^2 near 1") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial}) {
    double sum = 0.0;
    for (int seed = 1; seed <= 400; ++seed) {
      auto const mean = problem.run({.size = 1000, .seed = seed}).resample(300, {.seed = seed, .scheme = how}).expectation(law::itself);
      double const z = (mean.value - 0.5) / mean.standard_error;
      sum += z * z;
    }
    CHECK(std::abs(sum / 400 - 1.0) < 5.0 * std::sqrt(2.0 / 400));
  }
}

TEST_CASE("a resample that is refused") {
  auto const sample = sy::weigh(four, by_number);
  CHECK(said<sy::bad_argument>([&] { sample.resample(0); }) == "resample: 0 states were asked for; at least one is allowed");
  CHECK(said<sy::bad_argument>([&] { sample.resample(-1); }) == "count: -1 is negative; a count is zero or more");
  CHECK(said<sy::bad_argument>([&] { sample.resample(5, {.seed = -2}); }) == "count: -2 is negative; a count is zero or more");
}

TEST_CASE("log-weights at +-1e5 resample as at zero") {
  for (double const c : {-1e5, 1e5}) {
    auto const far = sy::weigh(four, [c](double x) { return sy::log_likelihood{c + std::log(x + 1.0)}; });
    auto const copies = far.resample(1000, {.seed = 11}).copies();
    for (auto const& [i, m] : copies) CHECK(std::abs(static_cast<double>(m) - 100.0 * (static_cast<double>(i) + 1.0)) <= 1.0);
  }
}
