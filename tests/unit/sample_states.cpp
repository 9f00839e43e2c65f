// SPDX-License-Identifier: BSL-1.0
// Looking at states: kept ones and those made again, by position and by stream, and
// what each look costs in calls of the sampler.

#include <doctest/doctest.h>

#include <cstdint>
#include <memory>
#include <optional>
#include <stdexcept>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::said;

namespace {

struct huge_state {
  explicit huge_state(double x) : cells(std::make_unique<double[]>(3)) { cells[0] = x; }
  std::unique_ptr<double[]> cells;
};
huge_state draw_huge(sy::draws& draws) { return huge_state(draws.normal()); }
sy::log_likelihood read_huge(huge_state const& s) { return law::read_one(s.cells[0]); }
double first_cell(huge_state const& s) { return s.cells[0]; }

template <class X>
concept gives_a_copy = requires(sy::weighted_sample<X> const& sample) { sample.state(5); };
static_assert(gives_a_copy<double>);

std::optional<double> may_fail(sy::draws& draws) {
  double const x = draws.normal();
  if (draws.chance(0.1)) return std::nullopt;
  return x;
}

sy::plan const kept{.size = 3000, .seed = 1};
sy::plan const rebuilt{.size = 3000, .seed = 1, .keep = sy::keeping::streams};

}  // namespace

TEST_CASE("a state by position is the same kept and made again") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const a = problem.run(kept), b = problem.run(rebuilt);
  for (std::size_t const i : {0u, 1u, 1023u, 1024u, 2999u}) {
    CHECK(a.state(i) == a.states()[i]);
    CHECK(b.state(i) == a.states()[i]);
    CHECK(b.with_state(i, [](double x) { return 2.0 * x; }) == 2.0 * a.states()[i]);
    CHECK(a.with_state(i, [](double x) { return std::to_string(x); }) == std::to_string(a.states()[i]));
    CHECK(problem.replay(kept, i) == a.states()[i]);
    CHECK(a.sample_index(i) == i);
  }
  double seen = 0.0;
  b.with_state(7, [&](double const& x) { seen = x; });
  CHECK(seen == a.states()[7]);
}

TEST_CASE("states that cannot be copied are looked at where they are, or made again for the look") {
  sy::pipeline const problem{&draw_huge, &read_huge};
  auto const a = problem.run(kept), b = problem.run(rebuilt);
  CHECK(a.with_state(5, &first_cell) == b.with_state(5, &first_cell));
  CHECK(a.states()[5].cells[0] == problem.replay(rebuilt, 5).cells[0]);
  static_assert(!gives_a_copy<huge_state>);
  CHECK((law::bits(a.expectation(&first_cell)) == law::bits(b.expectation(&first_cell))));
}

TEST_CASE("states are refused where only streams were kept, and past the end") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const a = problem.run(kept), b = problem.run(rebuilt);
  CHECK(said<sy::not_kept>([&] { b.states(); }) ==
        "states: this sample kept its streams only; use with_state(i, f), or run with keeping::states");
  CHECK(said<sy::bad_argument>([&] { a.state(3000); }) == "with_state: there is no state 3000 among 3000");
  CHECK(said<sy::bad_argument>([&] { b.with_state(5000, law::itself); }) == "with_state: there is no state 5000 among 3000");
  CHECK(said<sy::bad_argument>([&] { a.sample_index(3000); }) == "sample_index: there is no state 3000 among 3000");
}

TEST_CASE("after failed runs a state's stream is not its position") {
  sy::pipeline const failing{may_fail, law::read_one};
  sy::plan plan{.size = 5000, .seed = 2, .on_failure = sy::failures::set_aside};
  auto const a = failing.run(plan);
  plan.keep = sy::keeping::streams;
  auto const b = failing.run(plan);
  CHECK(a.size() < 5000);
  CHECK(a.size() + a.diagnosis().failed() == 5000);
  std::uint64_t moved = 0;
  for (std::size_t i = 0; i < a.size(); ++i) {
    CHECK(a.sample_index(i) >= i);
    CHECK(a.sample_index(i) == b.sample_index(i));
    moved += a.sample_index(i) != i ? 1u : 0u;
    if (i % 97 == 0) {
      CHECK(failing.replay(plan, a.sample_index(i)) == a.states()[i]);
      CHECK(b.state(i) == a.states()[i]);
    }
  }
  CHECK(moved > a.size() / 2);
  CHECK(a.sample_index(a.size() - 1) < 5000);
}

TEST_CASE("calls of the sampler: the run, its spot checks, and each replay") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const a = problem.run(kept), b = problem.run(rebuilt);
  std::uint64_t const run = a.sampler_calls();
  CHECK(run > 3000);
  CHECK(run <= 3000 + 8);
  CHECK(b.sampler_calls() == run);
  CHECK(a.expectation(law::itself).value != 0.0);
  CHECK(a.sampler_calls() == run);  // kept states are not made again

  b.estimate(sy::expectation(law::itself), sy::probability(law::above_one), sy::histogram(law::itself), sy::quantile(law::itself, 0.5));
  CHECK(b.sampler_calls() == run + 3000);  // once for all four questions
  CHECK(b.log_evidence().value < 0.0);
  CHECK(b.before().log_weights().size() == 3000);
  CHECK(b.sampler_calls() == run + 3000);  // what needs no state costs none
  auto const answers = b.estimate(sy::expectation(law::itself));
  CHECK(answers.sampler_calls() == run + 6000);
  b.state(17);
  CHECK(b.sampler_calls() == run + 6001);
  auto const drawn = b.resample(100, {.seed = 1});
  CHECK(b.sampler_calls() == run + 6001 + drawn.copies().size());

  auto const half = b.reweigh([](double x) { return sy::likelihood{x > 0.0 ? 1.0 : 0.0}; });
  std::uint64_t const before = half.sampler_calls();
  std::uint64_t possible = 0;
  for (double const w : half.log_weights()) possible += w > -1.0 ? 1u : 0u;
  half.expectation(law::itself);
  CHECK(half.sampler_calls() == before + possible);  // impossible states are not made again

  auto const streamed = problem.estimate(kept, sy::expectation(law::itself));
  CHECK(streamed.sampler_calls() == run);
  CHECK(streamed.drawn() == 3000);
}

TEST_CASE("what a look throws comes out as it was thrown; what the sampler throws is named") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  auto const a = problem.run(kept), b = problem.run(rebuilt);
  auto const throws = [](double) -> double { throw std::out_of_range("no such cell"); };
  CHECK_THROWS_AS(a.with_state(0, throws), std::out_of_range);
  CHECK_THROWS_AS(b.with_state(0, throws), std::out_of_range);
  auto const throws_late = [](double x) -> double {
    if (x > 3.0) throw std::out_of_range("no such cell");
    return x;
  };
  for (auto const* sample : {&a, &b}) {
    try {
      sample->expectation(throws_late);
      FAIL("no exception");
    } catch (sy::failed_sample const& failure) {
      CHECK(problem.replay(kept, failure.index()) > 3.0);
      for (std::uint64_t i = 0; i < failure.index(); ++i) CHECK(a.states()[i] <= 3.0);
      CHECK(std::string(failure.what()) ==
            "a readout of sample " + std::to_string(failure.index()) + " failed: no such cell");
      CHECK_THROWS_AS(std::rethrow_if_nested(failure), std::out_of_range);
    }
    CHECK(sample->expectation(law::itself).effective_size > 1.0);  // the sample is as it was
  }
}
