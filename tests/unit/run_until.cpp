// SPDX-License-Identifier: BSL-1.0
// Stopping at a target for the standard error.
#include <doctest/doctest.h>

#include <cmath>
#include <string>

#include <steelyard/core.hpp>

namespace sy = steelyard;

namespace {

auto const prior = [](sy::draws& d) { return d.normal(); };
auto const weighter = [](double x) { return sy::log_likelihood{-2.0 * (1.2 - x) * (1.2 - x)}; };
auto const itself = [](double x) { return x; };
auto const rare = [](double x) { return x > 2.2; };

bool missed(sy::diagnosis const& d) {
  for (sy::finding const& f : d.findings())
    if (f.kind == sy::finding_kind::target_missed) return true;
  return false;
}

}  // namespace

TEST_CASE("a run stops at the first doubled size where every target is met") {
  sy::pipeline const pipe{prior, weighter};
  auto const answers = pipe.estimate({.size = 4'000'000, .seed = 3}, sy::until(sy::expectation(itself), 0.005),
                                     sy::until(sy::probability(rare), sy::relative{0.1}), sy::log_evidence());
  auto const& [mean, tail, evidence] = answers;
  CHECK(mean.standard_error <= 0.005);
  CHECK(tail.standard_error <= 0.1 * tail.value);
  CHECK(tail.carriers >= 30.0);
  CHECK_FALSE(missed(answers.diagnosis()));
  std::uint64_t const drawn = answers.drawn();
  CHECK(drawn % 1024 == 0);
  CHECK((drawn / 1024 & (drawn / 1024 - 1)) == 0);  // a power of two of blocks
  // Half of it would not have done.
  auto const [half_mean, half_tail] =
      pipe.estimate({.size = drawn / 2, .seed = 3}, sy::expectation(itself), sy::probability(rare));
  CHECK((half_mean.standard_error > 0.005 || half_tail.standard_error > 0.1 * half_tail.value || half_tail.carriers < 30.0));
  // The size drawn repeats the bits.
  auto const [again, more] = pipe.estimate({.size = drawn, .seed = 3}, sy::expectation(itself), sy::log_evidence());
  CHECK(again.value == mean.value);
  CHECK(more.standard_error == evidence.standard_error);
}

TEST_CASE("a small error from few carriers does not stop a run") {
  // The target is met at once by the sd of a handful of terms; the rule waits for 30 of them.
  sy::pipeline const pipe{prior, weighter};
  auto const answers = pipe.estimate({.size = 1'000'000, .seed = 1}, sy::until(sy::probability([](double x) { return x > 3.0; }), 0.5));
  CHECK(answers.get<0>().carriers >= 30.0);
  CHECK(answers.drawn() > 1024);
}

TEST_CASE("a target out of reach is a finding, and the size is the most that is drawn") {
  sy::pipeline const pipe{prior, weighter};
  auto const answers = pipe.estimate({.size = 5'000}, sy::until(sy::expectation(itself), 1e-9));
  CHECK(answers.drawn() == 5'000);
  CHECK(missed(answers.diagnosis()));
  CHECK(answers.get<0>().value == pipe.expectation({.size = 5'000}, itself).value);
}

TEST_CASE("targets are the same for any threads, wait for automatic edges, and mean nothing on a kept sample") {
  sy::pipeline const pipe{prior, weighter};
  auto const run = [&](unsigned threads) {
    return pipe.estimate({.size = 1'000'000, .seed = 2, .threads = threads}, sy::until(sy::expectation(itself), 0.01),
                         sy::histogram(itself));
  };
  auto const one = run(1), two = run(2);
  CHECK(one.drawn() == two.drawn());
  CHECK(one.get<0>().value == two.get<0>().value);
  CHECK(one.get<1>().probability(3).value == two.get<1>().probability(3).value);
  auto const kept = pipe.run({.size = 3'000});
  CHECK(kept.estimate(sy::until(sy::expectation(itself), 1e-9)).get<0>().value == kept.expectation(itself).value);
}

TEST_CASE("a target that is no positive number is refused") {
  for (double const target : {0.0, -1.0}) {
    CHECK_THROWS_AS((void)sy::until(sy::expectation(itself), target), sy::bad_argument);
    CHECK_THROWS_AS((void)sy::until(sy::expectation(itself), sy::relative{target}), sy::bad_argument);
  }
}
