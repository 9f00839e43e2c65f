// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>
#include <steelyard/proof/agrees.hpp>
#include <steelyard/proof/coverage.hpp>

#include <cstddef>
#include <cstdint>
#include <limits>
#include <stdexcept>
#include <string>
#include <vector>

namespace sy = steelyard;
using sy::proof::agrees;
using sy::proof::outcome;

namespace {

bool says(sy::proof::check const& c, char const* words) { return c.sentence().find(words) != std::string::npos; }

/// An estimate of single samples: n terms of one size carry the error bar.
sy::estimate carried(double value, double se, double n) {
  sy::run_facts facts;
  facts.drawn = static_cast<std::uint64_t>(n);
  facts.sum = n;
  facts.sum_squares = n;
  double const squares = se * se * (n - 1.0) / n;
  return {value, {squares, squares * (squares / n), squares / n}, facts};
}

auto const itself = [](double x) { return x; };
auto const model =
    sy::pipeline{[](sy::draws& d) { return d.normal(); },
                 [](double x) { return sy::log_likelihood{-0.5 * (1.0 - x) * (1.0 - x)}; }};  // N(1/2, 1/2)

}  // namespace

TEST_CASE("an estimate agrees up to the limit of Student's t, and no further") {
  // t of 99 degrees of freedom at 1 - 0.5e-4: 4.0553 (Boost.Math students_t).
  sy::estimate const e = carried(10.0, 0.5, 100);
  CHECK(e.degrees_of_freedom == doctest::Approx(99));
  CHECK(agrees(e, 10.0));
  CHECK(agrees(e, 10.0 + 0.5 * 4.05));
  CHECK(agrees(e, 10.0 + 0.5 * 4.07).result() == outcome::failed);
  CHECK(agrees(e, 10.0 - 0.5 * 4.07).result() == outcome::failed);
  CHECK(says(agrees(e, 12.5), " 5 standard errors apart"));
  CHECK(agrees(e, 10.0 + 0.5 * 4.07, {.false_alarm = 1e-5}));
}

TEST_CASE("a stated difference that could go unseen cannot be certified") {
  sy::estimate const e = carried(10.0, 0.5, 100);
  // limit 4.055 plus the 90 % point 1.290 of t, times 0.5: 2.673
  CHECK(agrees(e, 10.1, {.difference = 2.7}));
  CHECK(agrees(e, 10.1, {.difference = 2.6}).result() == outcome::cannot_certify);
  CHECK(says(agrees(e, 10.1, {.difference = 2.6}), "could go unseen"));
  CHECK(agrees(e, 20.0, {.difference = 2.6}).result() == outcome::failed);
}

TEST_CASE("too few carriers for the rate cannot be certified") {
  CHECK(agrees(carried(1.0, 0.1, 19), 1.0).result() == outcome::cannot_certify);
  CHECK(agrees(carried(1.0, 0.1, 21), 1.0));
  CHECK(agrees(carried(1.0, 0.1, 21), 1.0, {.false_alarm = 1e-6}).result() == outcome::cannot_certify);
  CHECK(says(agrees(carried(1.0, 0.1, 19), 5.0), "cannot certify"));
  CHECK_FALSE(agrees(carried(1.0, 0.1, 19), 1.0));
}

TEST_CASE("no error bar: equal is equal, and anything else cannot be told") {
  auto const sample = model.run({.size = 500});
  sy::estimate const constant = sample.expectation([](double) { return 0.1; });
  CHECK(agrees(constant, 0.1));
  CHECK(agrees(constant, 0.1 + 1e-9).result() == outcome::cannot_certify);
  CHECK(agrees(constant, constant));
}

TEST_CASE("an event never or always seen is judged by its one-sided limit") {
  auto const sample = model.run({.size = 2'000});
  sy::estimate const never = sample.probability([](double x) { return x > 50.0; });
  CHECK(agrees(never, 0.0));
  CHECK(agrees(never, 1e-12).result() == outcome::cannot_certify);
  CHECK(agrees(never, 0.3).result() == outcome::failed);
  CHECK(says(agrees(never, 0.3), "never seen"));
  sy::estimate const always = sample.probability([](double x) { return x < 50.0; });
  CHECK(agrees(always, 1.0));
  CHECK(agrees(always, 0.7).result() == outcome::failed);
  CHECK(agrees(never, sample.probability([](double x) { return x > 0.5; })).result() == outcome::cannot_certify);
}

TEST_CASE("two estimates by Welch's degrees of freedom") {
  sy::estimate const a = carried(1.0, 0.3, 50), b = carried(2.0, 0.4, 200);
  // gap 1.0, se 0.5; dof = 0.25^2 / (0.09^2/49 + 0.16^2/199) = 212.7
  CHECK(agrees(a, b));
  CHECK(says(agrees(a, b), " 2 standard errors apart"));
  CHECK(agrees(a, carried(3.2, 0.4, 200)).result() == outcome::failed);
  CHECK(agrees(carried(1.0, 1.0, 6), b).result() == outcome::cannot_certify);
  CHECK(agrees(carried(1.0, 0.3, 3), b).result() == outcome::cannot_certify);  // broken
  CHECK(says(agrees(carried(1.0, 0.3, 3), b), "broken"));
}

TEST_CASE("bad input to agrees") {
  sy::estimate const e = carried(1.0, 0.1, 100);
  CHECK_THROWS_WITH_AS((void)agrees(e, 1.0, {.false_alarm = 0.0}), "agrees: the false-alarm rate 0 is outside (0, 1)",
                       sy::bad_argument);
  CHECK_THROWS_AS((void)agrees(e, std::numeric_limits<double>::quiet_NaN()), sy::bad_argument);
  CHECK_THROWS_AS((void)agrees(e, 1.0, {.difference = -1.0}), sy::bad_argument);
  CHECK(agrees(carried(std::numeric_limits<double>::quiet_NaN(), 0.1, 100), 1.0).result() == outcome::failed);
}

TEST_CASE("a right answer fails at the stated rate, a wrong one nearly always") {
  std::uint64_t alarms = 0, caught = 0;
  constexpr std::uint64_t trials = 2'000;
  for (std::uint64_t seed = 1; seed <= trials; ++seed) {
    sy::estimate const e = model.expectation({.size = 1'000, .seed = seed}, itself);
    alarms += agrees(e, 0.5, {.false_alarm = 0.05}) ? 0u : 1u;
    caught += agrees(e, 0.5 + 0.15, {.false_alarm = 0.05}) ? 0u : 1u;
  }
  auto const limits = sy::proof::detail::hit_limits(trials, 0.05, 1e-6);
  CHECK(alarms >= limits.first);
  CHECK(alarms <= limits.second);
  CHECK(caught > trials * 95 / 100);  // the se is 0.022
}

TEST_CASE("coverage: honest intervals pass, narrow, wide and shifted ones fail and are named") {
  auto const around = [](double factor, double shift) {
    return [=](std::uint64_t seed) {
      sy::draws d(seed, 0);
      double const x = d.normal() + shift;
      return sy::interval{x - 1.959963984540054 * factor, x + 1.959963984540054 * factor, true, true};
    };
  };
  auto const honest = sy::proof::coverage(around(1.0, 0.0), 0.0);
  CHECK(honest);
  CHECK(honest.hits() + honest.below() + honest.above() == 1'000u);
  CHECK(says(honest, "allowed are 921 to 975"));
  auto const narrow = sy::proof::coverage(around(0.8, 0.0), 0.0);
  CHECK(narrow.result() == outcome::failed);
  CHECK(says(narrow, "too narrow"));
  auto const wide = sy::proof::coverage(around(1.4, 0.0), 0.0);
  CHECK(says(wide, "too wide"));
  auto const shifted = sy::proof::coverage(around(1.0, 1.0), 0.0);
  CHECK(shifted.result() == outcome::failed);
  CHECK(shifted.above() > 10 * shifted.below());
  // 93 to 97.5 % accepted: a true 94 % passes, a true 92 % does not (4000 repeats)
  CHECK(sy::proof::coverage(around(1.880793608151251 / 1.959963984540054, 0.0), 0.0,
                            {.lowest = 0.93, .highest = 0.975, .repeats = 4'000}));
  CHECK_FALSE(sy::proof::coverage(around(1.6448536269514722 / 1.959963984540054, 0.0), 0.0,
                                  {.lowest = 0.93, .highest = 0.975, .repeats = 4'000}));
  CHECK(sy::proof::coverage(around(1.0, 0.0), 0.0, {.repeats = 2}).result() == outcome::cannot_certify);
  CHECK(says(sy::proof::coverage(around(1.0, 0.0), 0.0, {.repeats = 100}), "cannot show intervals that are too wide"));
}

TEST_CASE("coverage: an unknown end covers everything on its side") {
  auto const open = [](std::uint64_t) { return sy::interval{1.0, 0.0, true, false}; };
  CHECK(sy::proof::coverage(open, 5.0, {.level = 0.5, .repeats = 100}).hits() == 100u);
  CHECK(sy::proof::coverage(open, 0.5, {.repeats = 100}).above() == 100u);
}

TEST_CASE("coverage: does not depend on the executor, counts what it has done, and names the first failure") {
  auto const interval_for = [](std::uint64_t seed) {
    sy::draws d(seed, 0);
    double const x = d.normal();
    return sy::interval{x - 2.0, x + 2.0, true, true};
  };
  std::uint64_t last = 0, calls = 0;
  auto const once = sy::proof::coverage(interval_for, 0.0, {.repeats = 500});
  auto const again = sy::proof::coverage(
      interval_for, 0.0,
      {.repeats = 500, .executor = sy::on_threads(2), .progress = [&](std::uint64_t done, std::uint64_t all) {
         CHECK(done > last);
         CHECK(all == 500u);
         last = done;
         ++calls;
       }});
  CHECK(again.sentence() == once.sentence());
  CHECK(last == 500u);
  CHECK(calls == 32u);
  auto const failing = [](std::uint64_t seed) -> sy::interval {
    if (seed >= 20) throw std::runtime_error("seed " + std::to_string(seed));
    return {};
  };
  CHECK_THROWS_WITH_AS(sy::proof::coverage(failing, 0.0, {.repeats = 500, .executor = sy::on_threads(2)}), "seed 20",
                       std::runtime_error);
}

TEST_CASE("coverage of a pipeline's own answers, within a budget of samples") {
  auto const mean = sy::proof::coverage(model, {.size = 1'000}, sy::expectation(itself), 0.5, {.repeats = 400});
  CHECK(mean);
  CHECK(mean.sampler_calls() >= 400'000u);
  CHECK(sy::proof::coverage(model, {.size = 1'000}, sy::quantile(itself, 0.5), 0.5, {.repeats = 200}));
  CHECK_FALSE(sy::proof::coverage(model, {.size = 1'000}, sy::expectation(itself), 0.6, {.repeats = 200}));
  auto const cheap =
      sy::proof::coverage(model, {.size = 1'000}, sy::expectation(itself), 0.5, {.repeats = 400, .budget = 210'000});
  CHECK(says(cheap, "of 210 intervals"));
  CHECK_THROWS_AS(sy::proof::coverage(model, {.size = 1'000}, sy::expectation(itself), 0.5, {.budget = 999}),
                  sy::bad_argument);
  // no sample has any likelihood: an unbounded interval
  sy::pipeline const nothing{[](sy::draws& d) { return d.normal(); }, [](double) { return sy::likelihood{0.0}; }};
  CHECK(
      sy::proof::coverage(nothing, {.size = 10}, sy::expectation(itself), 0.0, {.level = 0.5, .repeats = 50}).hits() ==
      50u);
}

TEST_CASE("bad input to coverage") {
  auto const one = [](std::uint64_t) { return sy::interval{0.0, 1.0, true, true}; };
  auto const bad = [](std::uint64_t) {
    return sy::interval{0.0, std::numeric_limits<double>::quiet_NaN(), true, true};
  };
  CHECK_THROWS_AS(sy::proof::coverage(one, 0.5, {.level = 1.0}), sy::bad_argument);
  CHECK_THROWS_AS(sy::proof::coverage(one, 0.5, {.lowest = 0.98, .highest = 0.9}), sy::bad_argument);
  CHECK_THROWS_AS(sy::proof::coverage(one, 0.5, {.repeats = 0}), sy::bad_argument);
  CHECK_THROWS_AS(sy::proof::coverage(bad, 0.5, {.repeats = 10}), sy::bad_argument);
  CHECK_THROWS_AS(sy::proof::coverage(one, std::numeric_limits<double>::infinity(), {.repeats = 10}), sy::bad_argument);
}
