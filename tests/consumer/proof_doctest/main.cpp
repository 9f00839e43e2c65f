// SPDX-License-Identifier: BSL-1.0
#define DOCTEST_CONFIG_IMPLEMENT_WITH_MAIN
#include <doctest/doctest.h>

#include <steelyard/proof.hpp>

#include <sstream>

#include "../hive.hpp"

namespace sy = steelyard;
namespace proof = steelyard::proof;

TEST_CASE("the whole model is calibrated, and one with a wrong balance is not") {
  auto const honey = &hive::state::honey;
  CHECK(proof::calibration(hive::sampler, hive::weigh_hive, [](double y) { return hive::weighter(y); }, honey));
  proof::check const wrong =
      proof::calibration(hive::sampler, hive::weigh_hive, [](double y) { return hive::weighter(y, 0.8); }, honey);
  CHECK_FALSE(wrong);
  std::ostringstream said;
  said << wrong;
  CHECK(said.str().find("too narrow") != std::string::npos);
  CHECK(doctest::toString(wrong).size() > 0);
}

TEST_CASE("a summer of either kind") {
  sy::pipeline const pipe{hive::sampler, hive::weighter(17.0)};
  // P(good | 17) by the two normal densities N(17; 25, 16 + 2.25) and N(17; 12, 9 + 2.25).
  auto const density = [](double mean, double variance) {
    return std::exp(-0.5 * (17 - mean) * (17 - mean) / variance) / std::sqrt(variance);
  };
  double const good = 0.6 * density(25, 18.25), poor = 0.4 * density(12, 11.25);
  CHECK(proof::agrees(pipe.probability({.size = 20'000}, &hive::state::good_summer), good / (good + poor)));
  CHECK(proof::coverage(pipe, {.size = 1'000}, sy::probability(&hive::state::good_summer), good / (good + poor),
                        {.repeats = 400}));
}

TEST_CASE("an own estimator") { CHECK(proof::self_check<hive::state>(hive::geometric_mean())); }

TEST_CASE("the plumbing, on a model with a known answer") {
  proof::normal_normal const known(20.0, 5.0, 23.0, 1.5);
  sy::pipeline const pipe{known.sampler(), known.weighter()};
  auto const sample = pipe.run({.size = 10'000});
  CHECK(proof::agrees(sample.expectation([](double x) { return x; }), known.mean()));
  CHECK(proof::agrees(sample.log_evidence(), known.log_evidence()));
}
