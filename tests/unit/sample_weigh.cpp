// SPDX-License-Identifier: BSL-1.0
// An ensemble weighed as it stands: what is borrowed, moved and copied, what kinds
// of states it may have, and what is refused.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <deque>
#include <list>
#include <memory>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;
using law::holds;
using law::said;

namespace {

struct run {
  double level;
  std::string note;
};
sy::likelihood by_level(run const& r) { return sy::likelihood{r.level}; }
sy::likelihood by_number(double x) { return sy::likelihood{x}; }

struct huge_state {
  explicit huge_state(double x) : cells(std::make_unique<double[]>(3)) { cells[0] = x; }
  std::unique_ptr<double[]> cells;
};
double first_cell(huge_state const& s) { return s.cells[0]; }

/// Counts its copies and moves.
struct counted {
  explicit counted(double v) : x(v) {}
  counted(counted const& other) : x(other.x) { ++copies; }
  counted(counted&& other) noexcept : x(other.x) { ++moves; }
  counted& operator=(counted const&) = delete;
  double x;
  static inline int copies = 0;
  static inline int moves = 0;
};

}  // namespace

TEST_CASE("a span is borrowed: no state is copied or moved") {
  std::vector<run> const runs{{1.0, "a"}, {3.0, "b"}};
  auto const sample = sy::weigh(std::span<run const>(runs), &by_level);
  CHECK(sample.states().data() == runs.data());
  CHECK(sample.expectation(&run::level).value == 2.5);
  std::vector<counted> many;
  many.reserve(3);
  for (double const x : {1.0, 2.0, 3.0}) many.emplace_back(x);
  counted::copies = counted::moves = 0;
  auto const borrowed = sy::weigh(std::span<counted const>(many), [](counted const& c) { return sy::likelihood{c.x}; });
  CHECK(borrowed.expectation(&counted::x).value == doctest::Approx(14.0 / 6.0));
  CHECK(borrowed.reweigh([](counted const&) { return sy::likelihood{1.0}; }).expectation(&counted::x).value == 2.0);
  CHECK(counted::copies == 0);
  CHECK(counted::moves == 0);
}

TEST_CASE("a vector that is handed over is moved: its states stay where they are") {
  std::vector<run> runs{{1.0, "a"}, {3.0, "b"}};
  run const* const where = runs.data();
  auto const sample = sy::weigh(std::move(runs), &by_level);
  CHECK(sample.states().data() == where);
  CHECK(sample.state(1).note == "b");
}

TEST_CASE("what is still in the caller's hands is copied") {
  std::vector<run> runs{{1.0, "a"}, {3.0, "b"}};
  auto const sample = sy::weigh(runs, &by_level);
  CHECK(sample.states().data() != runs.data());
  runs[1].level = 0.0;
  CHECK(sample.states()[1].level == 3.0);
  std::vector<run> const fixed = runs;
  CHECK(sy::weigh(std::move(fixed), &by_level).states().data() != fixed.data());  // const: cannot be moved
  CHECK(fixed.size() == 2);
}

TEST_CASE("any range: arrays, lists, deques, initialised in place") {
  double const raw[] = {1.0, 3.0};
  CHECK(sy::weigh(raw, by_number).expectation(law::itself).value == 2.5);
  CHECK(sy::weigh(std::array{1.0, 3.0}, by_number).expectation(law::itself).value == 2.5);
  CHECK(sy::weigh(std::list<double>{1.0, 3.0}, by_number).expectation(law::itself).value == 2.5);
  CHECK(sy::weigh(std::deque<int>{1, 3}, by_number).expectation(law::itself).value == 2.5);
  auto const parent = sy::weigh(raw, by_number).resample(4, {.seed = 1});
  CHECK(sy::weigh(parent, by_number).expectation(law::itself).value == 2.8);  // 1, 3, 3, 3
}

TEST_CASE("states that cannot be copied: moved in with their vector, or taken one by one from what is handed over") {
  std::vector<huge_state> states;
  for (double const x : {1.0, 2.0, 3.0}) states.emplace_back(x);
  double const* const cell = states[2].cells.get();
  auto const sample = sy::weigh(std::move(states), [](huge_state const& s) { return sy::likelihood{s.cells[0]}; });
  CHECK(sample.states()[2].cells.get() == cell);
  CHECK(sample.expectation(&first_cell).value == doctest::Approx(14.0 / 6.0));
  auto const chosen = sample.resample(6, {.seed = 1});
  CHECK(chosen.copies().back().second == 3);
  CHECK(&chosen[0] >= sample.states().data());

  std::list<huge_state> listed;
  for (double const x : {1.0, 2.0, 3.0}) listed.emplace_back(x);
  double const* const last = listed.back().cells.get();
  auto const of_list = sy::weigh(std::move(listed), [](huge_state const& s) { return sy::likelihood{s.cells[0]}; });
  CHECK(of_list.states()[2].cells.get() == last);
}

TEST_CASE("truth values as states: no vector<bool> inside") {
  auto const twice = [](bool b) { return sy::likelihood{b ? 3.0 : 1.0}; };
  std::vector<bool> const flags{true, false, true, false};
  auto const sample = sy::weigh(flags, twice);
  static_assert(std::is_same_v<decltype(sample)::state_type, bool>);
  CHECK(sample.states()[0]);
  CHECK(!sample.states()[3]);
  CHECK(sample.expectation([](bool b) { return b; }).value == 0.75);
  CHECK(close(sy::weigh(std::vector<bool>{true, false}, twice).probability([](bool b) { return b; }).value, 0.75));
  CHECK(sy::pipeline{[](sy::draws& d) { return d.chance(0.5); }, twice}.run({.size = 1000}).states().size() == 1000);
}

TEST_CASE("prior weights, plain or as logarithms, multiply the likelihood") {
  std::vector<double> const states{1.0, 2.0, 3.0};
  auto const plain = sy::weigh(states, by_number, {.prior_weights = {3.0, 0.0, 1.0}});
  CHECK(close(plain.expectation(law::itself).value, 2.0));
  CHECK(close(plain.before().expectation(law::itself).value, 1.5));
  CHECK(close(plain.log_evidence().value, std::log(6.0 / 4.0)));
  CHECK(plain.size() == 3);
  auto const logs =
      sy::weigh(states, by_number, {.log_prior_weights = {std::log(3.0), -law::infinity(), 0.0}});
  CHECK(close(logs.expectation(law::itself), plain.expectation(law::itself), 1e-14));
  CHECK(close(logs.log_evidence(), plain.log_evidence(), 1e-14));
  auto const far = sy::weigh(states, by_number, {.log_prior_weights = {1e5 + std::log(3.0), -1e5, 1e5}});
  CHECK(close(far.expectation(law::itself).value, 2.0, 1e-9));
}

TEST_CASE("a state whose prior weight is zero is never scored") {
  auto const refuses_two = [](double x) { return sy::likelihood{x == 2.0 ? -1.0 : x}; };
  std::vector<double> const states{1.0, 2.0, 3.0};
  CHECK(sy::weigh(states, refuses_two, {.prior_weights = {1.0, 0.0, 1.0}}).expectation(law::itself).value == 2.5);
}

TEST_CASE("an event that no group met: the limit comes from the weight of the heaviest group") {
  auto const grouped = sy::weigh(std::vector<double>{1.0, 2.0, 3.0, 4.0}, by_number, {.groups = {7, 9, 7, 9}});
  auto const alone = sy::weigh(std::vector<double>{1.0, 2.0, 3.0, 4.0}, by_number);
  auto const above_five = [](double x) { return x > 5.0; };
  CHECK(grouped.probability(above_five).never_seen());
  CHECK(grouped.probability(above_five).error_interval(0.95).upper == doctest::Approx(1.0 - std::pow(0.05, 0.6)));
  CHECK(alone.probability(above_five).error_interval(0.95).upper == doctest::Approx(1.0 - std::pow(0.05, 0.4)));
  CHECK(grouped.probability([](double x) { return x < 5.0; }).error_interval(0.95).lower ==
        doctest::Approx(std::pow(0.05, 0.6)));
}

TEST_CASE("what weigh refuses, in words") {
  std::vector<double> const two{1.0, 2.0};
  auto const refused = [&](sy::weigh_options options) {
    return said<sy::error>([&] { sy::weigh(two, by_number, std::move(options)); });
  };
  CHECK(said<sy::bad_argument>([] { sy::weigh(std::vector<double>{}, by_number); }) ==
        "weigh: the ensemble is empty; at least one state is needed");
  CHECK(refused({.prior_weights = {1.0}}) == "weigh: there are 1 prior weights for 2 states; one each is needed");
  CHECK(refused({.log_prior_weights = {1.0, 1.0, 1.0}}) ==
        "weigh: there are 3 logarithms of prior weights for 2 states; one each is needed");
  CHECK(refused({.counts = {1}}) == "weigh: there are 1 counts for 2 states; one each is needed");
  CHECK(refused({.groups = {1, 2, 3}}) == "weigh: there are 3 groups for 2 states; one each is needed");
  CHECK(refused({.prior_weights = {1.0, 1.0}, .log_prior_weights = {0.0, 0.0}}) ==
        "weigh: prior weights are given twice, plain and as logarithms; give one of them");
  CHECK(refused({.prior_weights = {1.0, -0.5}}) ==
        "weigh: the prior weight of state 1 is -0.5; it must be finite and zero or more");
  CHECK(refused({.prior_weights = {law::not_a_number(), 1.0}}) ==
        "weigh: the prior weight of state 0 is NaN; it must be finite and zero or more");
  CHECK(refused({.prior_weights = {1.0, law::infinity()}}) ==
        "weigh: the prior weight of state 1 is inf; it must be finite and zero or more");
  CHECK(refused({.log_prior_weights = {1.0, law::infinity()}}) ==
        "weigh: the logarithm of the prior weight of state 1 is inf; it must be finite or minus infinity");
  CHECK(refused({.log_prior_weights = {law::not_a_number(), 1.0}}) ==
        "weigh: the logarithm of the prior weight of state 0 is NaN; it must be finite or minus infinity");
  CHECK(refused({.prior_weights = {0.0, 0.0}}) == "weigh: every prior weight is zero");
  CHECK(refused({.counts = {0, 0}}) == "weigh: every count is zero");
  CHECK(two == std::vector<double>{1.0, 2.0});
}

TEST_CASE("no likelihood anywhere: how many, the largest log-likelihood seen, and the way on") {
  std::vector<double> const states{1.0, 2.0};
  auto const impossible = [](double) { return sy::likelihood{0.0}; };
  std::string const text = said<sy::no_likelihood>([&] { sy::weigh(states, impossible); });
  CHECK(holds(text, "weigh: none of the 2 samples drawn can be weighed above zero"));
  CHECK(holds(text, "largest log-likelihood seen: 'likelihood' minus infinity"));
  CHECK(holds(text, "draw from a wider prior, or use a tempered run"));
  auto const both = sy::together(sy::named("gauge", by_number), sy::named("limit", impossible));
  std::string const named = said<sy::no_likelihood>([&] { sy::weigh(states, both); });
  CHECK(holds(named, "'gauge' " + sy::detail::plain_number(sy::detail::portable_log(2.0)) + ", 'limit' minus infinity"));
}

TEST_CASE("a weighter that throws is named with its state, and the original is nested") {
  std::vector<double> const states{1.0, 2.0, 3.0};
  auto const throws = [](double x) {
    if (x > 1.5) throw std::invalid_argument("table ends at 1.5");
    return sy::likelihood{x};
  };
  try {
    sy::weigh(states, throws);
    FAIL("no exception");
  } catch (sy::failed_sample const& failure) {
    CHECK(failure.index() == 1);
    CHECK(std::string(failure.what()) == "the weighter of sample 1 failed: table ends at 1.5");
    CHECK_THROWS_AS(std::rethrow_if_nested(failure), std::invalid_argument);
  }
  auto const throws_number = [](double x) {
    if (x > 2.5) throw 7;
    return sy::likelihood{x};
  };
  CHECK(said<sy::failed_sample>([&] { sy::weigh(states, throws_number); }) ==
        "the weighter of sample 2 failed with an exception that is no std::exception");
}

TEST_CASE("an executor scores the states, to the same bits") {
  std::vector<double> states;
  sy::draws draws(1);
  for (int i = 0; i < 20'000; ++i) states.push_back(draws.normal());
  auto const alone = law::bits(sy::weigh(states, law::read_one).expectation(law::itself));
  CHECK(law::bits(sy::weigh(states, law::read_one, {.executor = sy::on_threads(3)}).expectation(law::itself)) == alone);
  CHECK(law::bits(sy::weigh(states, law::read_one, {.executor = law::backwards()}).expectation(law::itself)) == alone);
}
