// SPDX-License-Identifier: BSL-1.0
// Samplers and weighters that keep something between calls: found by replaying a few
// samples, named where states are kept, refused where states are made again.

#include <doctest/doctest.h>

#include <cstdint>
#include <random>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::holds;
using law::said;

namespace {

sy::likelihood any(double) { return sy::likelihood{1.0}; }

/// A distribution object outside the call: it holds back every second normal.
double keeps_a_distribution(sy::draws& draws) {
  static std::normal_distribution<double> law(0.0, 1.0);
  return law(draws);
}
double makes_it_anew(sy::draws& draws) {
  std::normal_distribution<double> law(0.0, 1.0);
  return law(draws);
}
/// Uses as many words each time, but what it returns drifts.
double drifts(sy::draws& draws) {
  static double drift = 0.0;
  drift += 1e-9;
  return draws.uniform() + drift;
}
/// Uses another number of words each time, for the same result.
double wastes(sy::draws& draws) {
  static int calls = 0;
  double const x = draws.normal();
  for (int k = ++calls % 3; k > 0; --k) draws();
  return x;
}
/// A weighter that remembers.
sy::likelihood remembers(double x) {
  static double before = 0.5;
  double const score = 1.0 + before * before;
  before = x;
  return sy::likelihood{score};
}
sy::likelihood of_state(double x) { return sy::likelihood{1.0 + x * x}; }

bool found(sy::diagnosis const& health) {
  for (sy::finding const& each : health.findings())
    if (each.kind == sy::finding_kind::hidden_state) return true;
  return false;
}
sy::plan plan_for(std::uint64_t size, sy::keeping keep = sy::keeping::states) { return {.size = size, .keep = keep}; }
std::vector<std::uint64_t> const sizes{7, 100, 1000, 5000};  // odd and even

}  // namespace

TEST_CASE("a distribution object kept between calls is found and named") {
  sy::pipeline const problem{&keeps_a_distribution, of_state};
  for (std::uint64_t const size : sizes) {
    CAPTURE(size);
    auto const sample = problem.run(plan_for(size));
    REQUIRE(found(sample.diagnosis()));
    for (sy::finding const& each : sample.diagnosis().findings())
      if (each.kind == sy::finding_kind::hidden_state) {
        CHECK(holds(each.text, "came out differently when its words were replayed"));
        CHECK(holds(each.text, "a distribution object that holds back a second normal"));
        CHECK(holds(each.text, "draws.normal()"));
      }
    CHECK(found(problem.estimate(plan_for(size), sy::expectation(law::itself)).diagnosis()));
  }
}

TEST_CASE("where states are made again, what is kept between calls is an error") {
  sy::pipeline const problem{&keeps_a_distribution, of_state};
  for (std::uint64_t const size : sizes) {
    CAPTURE(size);
    std::string const text = said<sy::hidden_state>([&] { problem.run(plan_for(size, sy::keeping::streams)); });
    CHECK(holds(text, "run: Sample "));
    CHECK(holds(text, "the sampler or weighter keeps something between calls"));
    CHECK(holds(said<sy::hidden_state>([&] { problem.resample(plan_for(size), 5); }), "keeps something between calls"));
  }
}

TEST_CASE("other ways of keeping something are found: by the words used, and by the bits of the log-likelihood") {
  CHECK(found(sy::pipeline{&drifts, of_state}.run(plan_for(1000)).diagnosis()));
  CHECK(found(sy::pipeline{&wastes, any}.run(plan_for(1000)).diagnosis()));
  CHECK(found(sy::pipeline{law::draw_normal, &remembers}.run(plan_for(1000)).diagnosis()));
  CHECK(!said<sy::hidden_state>([&] { sy::pipeline{law::draw_normal, &remembers}.run(plan_for(1000, sy::keeping::streams)); }).empty());
}

TEST_CASE("nothing is found where nothing is kept") {
  for (std::uint64_t const size : sizes) {
    CHECK(!found(sy::pipeline{&makes_it_anew, of_state}.run(plan_for(size)).diagnosis()));
    CHECK(!found(sy::pipeline{law::draw_normal, of_state}.run(plan_for(size, sy::keeping::streams)).diagnosis()));
  }
}

TEST_CASE("a worker's own scratch that is made ready in each call is no hidden state; a distribution in it is") {
  auto const clean = sy::per_worker([] {
    return [scratch = std::vector<double>()](sy::draws& draws) mutable {
      scratch.assign(3, 0.0);
      for (double& each : scratch) each = draws.normal();
      return scratch[0] + scratch[2];
    };
  });
  auto const unclean = sy::per_worker([] {
    return [law = std::normal_distribution<double>()](sy::draws& draws) mutable { return law(draws); };
  });
  for (unsigned threads : {1u, 2u}) {
    sy::plan const plan{.size = 5000, .threads = threads};
    CHECK(!found(sy::pipeline{clean, of_state}.run(plan).diagnosis()));
    CHECK(found(sy::pipeline{unclean, of_state}.run(plan).diagnosis()));
  }
}

TEST_CASE("a finding of hidden state stays when the sample is extended or reweighed") {
  sy::pipeline const problem{&keeps_a_distribution, of_state};
  auto const sample = problem.run(plan_for(1000));
  CHECK(found(sample.diagnosis()));
  CHECK(found(sample.reweigh(any).diagnosis()));
  CHECK(found(problem.extend(sample, 500).diagnosis()));
}
