// SPDX-License-Identifier: BSL-1.0
// Resampling in one pass: each slot holds a sample with probability in proportion to
// its weight, streams are kept, states made again.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include <boost/math/distributions/chi_squared.hpp>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::said;

namespace {

sy::pipeline const problem{law::draw_normal, law::read_one};

std::vector<std::size_t> indices_of(sy::ensemble<double> const& chosen) {
  return {chosen.indices().begin(), chosen.indices().end()};
}

/// Chance of a chi-square as large as that of the counts against their expected numbers, cells below 8 joined.
double chance(std::vector<double> const& seen, std::vector<double> const& expected) {
  double sum = 0.0, o = 0.0, e = 0.0, last_o = 0.0, last_e = 0.0;
  int cells = 0;
  for (std::size_t i = 0; i < seen.size(); ++i) {
    o += seen[i];
    e += expected[i];
    if (e < 8.0) continue;
    sum += (o - e) * (o - e) / e;
    ++cells;
    last_o = o;
    last_e = e;
    o = e = 0.0;
  }
  if (e > 0.0) {  // what is left joins the last cell
    sum -= (last_o - last_e) * (last_o - last_e) / last_e;
    sum += (last_o + o - last_e - e) * (last_o + o - last_e - e) / (last_e + e);
  }
  return boost::math::cdf(boost::math::complement(boost::math::chi_squared(cells - 1), sum));
}

}  // namespace

TEST_CASE("frequencies within a block, and over blocks, are in proportion to the weights") {
  // One run of each seed is one weighted sample; its slots are independent draws from it.
  for (std::uint64_t const size : {40u, 1000u, 5000u, 20'000u}) {
    CAPTURE(size);
    sy::plan const plan{.size = size, .seed = 1};
    auto const sample = problem.run(plan);
    double total = 0.0;
    for (double const l : sample.log_weights()) total += std::exp(l);
    std::size_t const k = 200'000;
    auto const chosen = problem.resample(plan, k);
    CHECK(chosen.size() == k);
    std::vector<double> seen(size), expected;
    for (double const l : sample.log_weights()) expected.push_back(std::exp(l) / total * static_cast<double>(k));
    for (std::size_t const i : chosen.indices()) seen[i] += 1.0;
    CHECK(chance(seen, expected) > 1e-4);
    for (std::size_t s = 0; s < k; s += 997) CHECK(chosen[s] == sample.states()[chosen.indices()[s]]);
  }
}

TEST_CASE("slots are independent of each other: neighbours agree as often as chance has it") {
  sy::plan const plan{.size = 3000, .seed = 2};
  auto const chosen = problem.resample(plan, 100'000);
  double const same = problem.run(plan).expectation(law::itself).effective_size;
  double agree = 0.0;
  for (std::size_t s = 1; s < chosen.size(); ++s) agree += chosen.indices()[s] == chosen.indices()[s - 1] ? 1.0 : 0.0;
  double const expected = 99'999.0 / same;  // sum W^2 is 1 over Kish's effective size
  CHECK(std::abs(agree - expected) < 5.0 * std::sqrt(expected));
}

TEST_CASE("weights of very different blocks: the running maximum may rise and fall") {
  // The first word of the stream is the sample's place: log-weights climb by 30 over the run and fall again.
  auto const draw = [](sy::draws& draws) { return draws.uniform(); };
  auto const steep = [](double u) { return sy::log_likelihood{u > 0.999 ? 500.0 : u > 0.99 ? 497.0 : 0.0}; };
  sy::pipeline const peaked{draw, steep};
  sy::plan const plan{.size = 50'000, .seed = 3};
  auto const chosen = peaked.resample(plan, 20'000);
  auto const exact = peaked.run(plan).probability([](double u) { return u > 0.999; });
  double high = 0.0;
  for (double const u : chosen) {
    CHECK(u > 0.99);
    high += u > 0.999 ? 1.0 : 0.0;
  }
  CHECK(std::abs(high / 20'000 - exact.value) < 5.0 * std::sqrt(exact.value * (1.0 - exact.value) / 20'000));
}

TEST_CASE("the same slots on any threads and executor, other slots for another seed") {
  sy::plan plan{.size = 30'000, .seed = 4};
  auto const alone = indices_of(problem.resample(plan, 500));
  plan.threads = 2;
  CHECK(indices_of(problem.resample(plan, 500)) == alone);
  plan.threads = 7;
  CHECK(indices_of(problem.resample(plan, 500)) == alone);
  plan.executor = law::backwards();
  CHECK(indices_of(problem.resample(plan, 500)) == alone);
  plan.seed = 5;
  CHECK(indices_of(problem.resample(plan, 500)) != alone);
}

TEST_CASE("runs set aside and impossible states are never drawn") {
  auto const may_fail = [](sy::draws& draws) -> std::optional<double> {
    double const x = draws.normal();
    if (draws.chance(0.5)) return std::nullopt;
    return x;
  };
  auto const positive = [](double x) { return sy::likelihood{x > 0.0 ? 1.0 : 0.0}; };
  sy::pipeline const failing{may_fail, positive};
  sy::plan const plan{.size = 9000, .seed = 6, .on_failure = sy::failures::set_aside};
  auto const chosen = failing.resample(plan, 2000);
  for (std::size_t s = 0; s < chosen.size(); ++s) {
    CHECK(chosen[s] > 0.0);
    CHECK(failing.replay(plan, chosen.indices()[s]) == chosen[s]);
  }
}

TEST_CASE("the error of a one-pass resample is the parent's and that of the slots together") {
  // Over 300 seeds: z^2 of the mean against the exact posterior mean 0.5; its own error is sqrt(2 / 300).
  double sum = 0.0;
  for (int seed = 1; seed <= 300; ++seed) {
    auto const mean = problem.resample({.size = 2000, .seed = seed}, 1000).expectation(law::itself);
    double const z = (mean.value - 0.5) / mean.standard_error;
    sum += z * z;
  }
  CHECK(std::abs(sum / 300 - 1.0) < 5.0 * std::sqrt(2.0 / 300));
}

TEST_CASE("what resampling refuses") {
  CHECK(said<sy::bad_argument>([] { problem.resample({.size = 100}, 0); }) ==
        "resample: 0 states were asked for; at least one is allowed");
  CHECK(said<sy::bad_argument>([] { problem.resample({.size = 100}, -3); }) == "count: -3 is negative; a count is zero or more");
  sy::pipeline const never{law::draw_normal, [](double) { return sy::likelihood{0.0}; }};
  CHECK(law::holds(said<sy::no_likelihood>([&] { never.resample({.size = 100}, 5); }), "none of the 100 samples drawn"));
}
