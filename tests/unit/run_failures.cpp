// SPDX-License-Identifier: BSL-1.0
// Samplers, weighters and readouts that fail: which sample is named, what is nested,
// and what runs set aside leave behind.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <optional>
#include <stdexcept>
#include <string>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::holds;
using law::said;

namespace {

double diverges(sy::draws& draws) {
  double const x = draws.normal();
  if (x > 2.0) throw std::runtime_error("solver diverged");
  return x;
}
std::optional<double> gives_up(sy::draws& draws) {
  double const x = draws.normal();
  if (x > 2.0) return std::nullopt;
  return x;
}
sy::likelihood any(double) { return sy::likelihood{1.0}; }

/// The first sample that draws more than 2.
std::uint64_t first_above_two(std::uint64_t seed) {
  for (std::uint64_t i = 0;; ++i) {
    sy::draws draws(seed, i);
    if (draws.normal() > 2.0) return i;
  }
}

}  // namespace

TEST_CASE("a sampler that throws stops the run: the lowest such sample, whatever the threads and the executor") {
  sy::pipeline const failing{diverges, any};
  for (std::uint64_t const seed : {1u, 2u, 3u, 4u, 5u}) {
    std::uint64_t const lowest = first_above_two(seed);
    auto const check = [&](sy::plan const& plan, auto act) {
      try {
        act(plan);
        FAIL("no exception");
      } catch (sy::failed_sample const& failure) {
        CHECK(failure.index() == lowest);
        CHECK(std::string(failure.what()) == "the sampler of sample " + std::to_string(lowest) + " failed: solver diverged");
        CHECK_THROWS_AS(std::rethrow_if_nested(failure), std::runtime_error);
      }
    };
    auto const everywhere = [&](sy::plan const& plan) {
      check(plan, [&](sy::plan const& p) { failing.run(p); });
      check(plan, [&](sy::plan const& p) { failing.expectation(p, law::itself); });
      check(plan, [&](sy::plan const& p) { failing.histogram(p, law::itself); });  // fails in the pilot
      check(plan, [&](sy::plan const& p) { failing.resample(p, 10); });
    };
    for (unsigned threads : {1u, 2u, 7u}) everywhere({.size = 30'000, .seed = seed, .threads = threads});
    everywhere({.size = 30'000, .seed = seed, .executor = law::backwards()});
    CHECK_THROWS_WITH_AS(failing.replay({.seed = seed}, lowest), "solver diverged", std::runtime_error);
  }
}

TEST_CASE("a sampler that returns no state stops the run like one that throws") {
  sy::pipeline const failing{gives_up, any};
  std::uint64_t const lowest = first_above_two(1);
  std::string const words = "the sampler of sample " + std::to_string(lowest) + " failed: it returned no state";
  for (unsigned threads : {1u, 2u}) {
    sy::plan const plan{.size = 30'000, .seed = 1, .threads = threads};
    CHECK(said<sy::failed_sample>([&] { failing.run(plan); }) == words);
    CHECK(said<sy::failed_sample>([&] { failing.expectation(plan, law::itself); }) == words);
  }
  CHECK(said<sy::failed_sample>([&] { failing.replay({.seed = 1}, lowest); }) ==
        "replay: the sampler of sample " + std::to_string(lowest) + " returned no state");
}

TEST_CASE("runs set aside: drawn with weight zero, counted, named, and the evidence divides by all that were drawn") {
  sy::plan const plan{.size = 40'000, .seed = 2, .threads = 2, .on_failure = sy::failures::set_aside};
  double const share = 0.5 * std::erfc(2.0 / std::sqrt(2.0));  // P(X > 2)
  auto const check = [&](auto const& failing) {
    auto const sample = failing.run(plan);
    auto const streamed = failing.estimate(plan, sy::log_evidence(), sy::expectation(law::itself));
    CHECK(sample.drawn() == 40'000);
    CHECK(streamed.drawn() == 40'000);
    CHECK(sample.size() + sample.diagnosis().failed() == 40'000);
    CHECK(streamed.diagnosis().failed() == sample.diagnosis().failed());
    double const failed = static_cast<double>(sample.diagnosis().failed());
    CHECK(std::abs(failed - 40'000 * share) < 5.0 * std::sqrt(40'000 * share));
    CHECK(law::close(sample.log_evidence().value, std::log1p(-failed / 40'000), 1e-10));
    CHECK(law::errors_off(sample.log_evidence(), std::log1p(-share)) < 5.0);
    CHECK((law::bits(streamed.template get<0>()) == law::bits(sample.log_evidence())));
    bool named = false;
    for (sy::finding const& each : sample.diagnosis().findings())
      if (each.kind == sy::finding_kind::failed_runs) {
        named = true;
        CHECK(holds(each.text, std::to_string(sample.diagnosis().failed()) + " of 40000 runs (2."));
        CHECK(holds(each.text, "failed and were set aside"));
        CHECK(holds(each.text, "at worst every probability could move by that much"));
      }
    CHECK(named);
    return law::bits(sample.expectation(law::itself));
  };
  // before() is the prior given success: X given X < 2.
  double const mean = -std::exp(-2.0) / std::sqrt(2.0 * 3.14159265358979323846) / (1.0 - share);
  auto const thrown = check(sy::pipeline{diverges, any});
  auto const given_up = check(sy::pipeline{gives_up, any});
  CHECK((thrown == given_up));
  auto const sample = sy::pipeline{gives_up, law::read_one}.run(plan);
  CHECK(law::errors_off(sample.before().expectation(law::itself), mean) < 5.0);
}

TEST_CASE("the error of the evidence counts the runs set aside among the draws") {
  // The evidence is the share of successes: log p, se = sqrt((1 - p) / (p (n - 1))) by the delta method.
  sy::plan const plan{.size = 10'000, .seed = 3, .on_failure = sy::failures::set_aside};
  auto const half = [](sy::draws& draws) -> std::optional<double> {
    if (draws.chance(0.5)) return std::nullopt;
    return 1.0;
  };
  auto const evidence = sy::pipeline{half, any}.run(plan).log_evidence();
  double const p = std::exp(evidence.value);
  CHECK(law::close(evidence.standard_error, std::sqrt((1.0 - p) / (p * 9999.0)), 1e-10));
  CHECK(evidence.verdict() == sy::verdict::sound);
}

TEST_CASE("when every run fails there is nothing to weigh, in words") {
  auto const never = [](sy::draws&) -> std::optional<double> { return std::nullopt; };
  sy::pipeline const failing{never, any};
  sy::plan const plan{.size = 3000, .on_failure = sy::failures::set_aside};
  CHECK(holds(said<sy::no_likelihood>([&] { failing.run(plan); }),
              "run: every one of the 3000 runs of the sampler failed and was set aside"));
  std::string const streamed = said<sy::no_likelihood>([&] { failing.expectation(plan, law::itself); });
  CHECK(holds(streamed, "estimate: none of the 3000 samples drawn can be weighed above zero"));
  CHECK(holds(streamed, "3000 runs failed"));
}

TEST_CASE("setting aside is for samplers: a weighter or readout that throws stops the run all the same") {
  auto const throws = [](double x) {
    if (x > 2.0) throw std::domain_error("off the table");
    return sy::likelihood{1.0};
  };
  sy::plan const plan{.size = 5000, .seed = 4, .on_failure = sy::failures::set_aside};
  std::uint64_t const lowest = first_above_two(4);
  std::string const number = std::to_string(lowest);
  sy::pipeline const problem{law::draw_normal, throws};
  CHECK(said<sy::failed_sample>([&] { problem.run(plan); }) == "the weighter of sample " + number + " failed: off the table");
  CHECK(said<sy::failed_sample>([&] { problem.expectation(plan, law::itself); }) ==
        "the weighter of sample " + number + " failed: off the table");
  auto const readout = [](double x) -> double {
    if (x > 2.0) throw 4;
    return x;
  };
  sy::pipeline const fine{law::draw_normal, any};
  CHECK(said<sy::failed_sample>([&] { fine.expectation(plan, readout); }) ==
        "a readout of sample " + number + " failed with an exception that is no std::exception");
  CHECK(said<sy::failed_sample>([&] { fine.run(plan).expectation(readout); }) ==
        "a readout of sample " + number + " failed with an exception that is no std::exception");
}

TEST_CASE("a readout that is no number stops the run only where the weight is positive") {
  auto const root = [](double x) { return x < 0.0 ? law::not_a_number() : std::sqrt(x); };
  auto const positive = [](double x) { return sy::likelihood{x < 0.0 ? 0.0 : 1.0}; };
  sy::plan const plan{.size = 5000, .seed = 5, .threads = 2};
  sy::pipeline const cut{law::draw_normal, positive};
  CHECK((law::bits(cut.expectation(plan, root)) == law::bits(cut.run(plan).expectation(root))));
  CHECK(cut.run(plan).quantile(root, 0.5).value > 0.0);

  sy::pipeline const whole{law::draw_normal, any};
  std::uint64_t lowest = 0;
  while (whole.replay(plan, lowest) >= 0.0) ++lowest;
  std::string const words = "estimate: a readout of sample " + std::to_string(lowest) +
                            " is NaN; it must be a finite number where the weight is positive";
  CHECK(said<sy::bad_readout>([&] { whole.expectation(plan, root); }) == words);
  CHECK(said<sy::bad_readout>([&] { whole.run(plan).expectation(root); }) == words);
  CHECK(said<sy::bad_readout>([&] { whole.run(plan).quantile(root, 0.5); }) == words);
  CHECK(said<sy::bad_readout>([&] { whole.run(plan).ratio(law::itself, root); }) == words);
}

TEST_CASE("when nothing is possible, one pass and a kept run tell the same") {
  auto const both = sy::together(sy::named("gauge", law::read_one), sy::named("limit", [](double) { return sy::likelihood{0.0}; }));
  sy::pipeline const problem{law::draw_normal, both};
  sy::plan const plan{.size = 3000, .seed = 6};
  std::string const kept = said<sy::no_likelihood>([&] { problem.run(plan); });
  std::string const streamed = said<sy::no_likelihood>([&] { problem.expectation(plan, law::itself); });
  CHECK(holds(kept, "none of the 3000 samples drawn can be weighed above zero"));
  CHECK(holds(kept, "'limit' minus infinity"));
  CHECK(kept.substr(kept.find(':')) == streamed.substr(streamed.find(':')));
}
