// SPDX-License-Identifier: BSL-1.0
// What a pipeline may be made of: objects of each worker's own, generators written for
// standard engines and seeds, states of every kind, and functions from other files.

#include <doctest/doctest.h>

#include <array>
#include <atomic>
#include <cmath>
#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <random>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::bits;

namespace {

/// A simulator with scratch space; it counts how many of it were made.
struct solver {
  explicit solver(std::atomic<int>& made) { ++made; }
  solver(solver&&) = default;
  std::vector<double> scratch;
  double operator()(sy::draws& draws) {
    scratch.assign(4, 0.0);
    for (double& each : scratch) each = draws.normal();
    return scratch[0];
  }
};
double first_of_four(sy::draws& draws) {
  double const x = draws.normal();
  for (int k = 0; k < 3; ++k) draws.normal();
  return x;
}

/// A likelihood with scratch space.
struct table {
  std::vector<double> scratch;
  sy::log_likelihood operator()(double x) {
    scratch.assign(1, law::read_one(x).value);
    return sy::log_likelihood{scratch[0]};
  }
};
/// A readout with scratch space.
struct gauge {
  std::array<double, 2> scratch{};
  double operator()(double x) {
    scratch = {x, x};
    return scratch[1];
  }
};
/// An itemised weighter with scratch space.
struct two_readings {
  static constexpr std::size_t size = 2;
  std::string_view name(std::size_t i) const { return i == 0 ? "first" : "second"; }
  void scores(double x, std::span<double> out) const {
    out[0] = law::read_one(x).value;
    out[1] = -0.5 * x * x;
  }
};

}  // namespace

TEST_CASE("a sampler, a weighter and a readout of each worker's own give the bits of plain ones") {
  for (unsigned threads : {1u, 2u, 7u}) {
    CAPTURE(threads);
    std::atomic<int> made{0};
    auto const own_sampler = sy::per_worker([&made] { return solver(made); });
    auto const own_weighter = sy::per_worker([] { return table{}; });
    auto const own_readout = sy::per_worker([] { return gauge{}; });
    sy::plan plan{.size = 30'000, .seed = 1, .threads = threads};
    sy::pipeline const plain{&first_of_four, law::read_one};
    sy::pipeline const own{own_sampler, own_weighter};
    auto const expected = bits(plain.run(plan).expectation(law::itself));
    auto const sample = own.run(plan);
    CHECK(made.load() >= 1);
    CHECK(made.load() <= static_cast<int>(threads));
    CHECK((bits(sample.expectation(own_readout)) == expected));
    CHECK((bits(own.expectation(plan, own_readout)) == expected));
    CHECK((bits(own.expectation(plan, sy::readout{"gauge", "m", own_readout})) == expected));
    CHECK((bits(sample.reweigh(own_weighter).expectation(law::itself)) == expected));
    CHECK(sample.values(own_readout)[5] == sample.states()[5]);
    plan.keep = sy::keeping::streams;
    CHECK((bits(own.run(plan).expectation(own_readout)) == expected));
    CHECK(own.replay(plan, 17) == sample.states()[17]);
    auto const event = sy::per_worker([] { return [n = 0](double x) mutable { return ++n > 0 && x > 0.0; }; });
    CHECK((bits(sample.probability(event)) == bits(sample.probability([](double x) { return x > 0.0; }))));
    CHECK((bits(sample.given(event).log_evidence()) == bits(sample.given([](double x) { return x > 0.0; }).log_evidence())));
  }
}

TEST_CASE("readings of each worker's own go together, bounded and named") {
  auto const own_weighter = sy::per_worker([] { return table{}; });
  auto const bounded = sy::bounded(sy::named("gauge", own_weighter), 0.0);
  auto const wrapped = sy::as_log_likelihood(sy::per_worker([] { return [](double x) { return -0.5 * x * x; }; }));
  auto const both = sy::together(bounded, sy::named("second", wrapped));
  sy::plan const plan{.size = 5000, .seed = 2, .threads = 2};
  auto const a = sy::pipeline{law::draw_normal, both}.run(plan);
  auto const b = sy::pipeline{law::draw_normal, two_readings{}}.run(plan);
  CHECK((bits(a.expectation(law::itself)) == bits(b.expectation(law::itself))));
  CHECK(a.names()[0] == "gauge");
  CHECK(b.names()[1] == "second");
  CHECK(a.log_likelihoods("second")[9] == b.log_likelihoods("second")[9]);
}

TEST_CASE("generators written for a standard engine or a seed") {
  auto const engine = sy::with_engine<std::mt19937_64>(
      [](std::mt19937_64& e) { return std::normal_distribution<double>(1.0, 2.0)(e); });
  auto const read_zero = [](double x) { return sy::log_likelihood{-0.5 * x * x}; };
  // N(1, 4) read as 0 with sd 1: mean 1/5, variance 4/5.
  sy::plan plan{.size = 50'000, .seed = 3};
  auto const sample = sy::pipeline{engine, read_zero}.run(plan);
  CHECK(law::errors_off(sample.expectation(law::itself), 0.2) < 5.0);
  CHECK(law::errors_off(sample.log_evidence(), -0.5 / 5.0 - 0.5 * std::log(5.0)) < 5.0);
  plan.threads = 2;
  CHECK((bits(sy::pipeline{engine, read_zero}.expectation(plan, law::itself)) == bits(sample.expectation(law::itself))));
  plan.keep = sy::keeping::streams;
  CHECK((bits(sy::pipeline{engine, read_zero}.run(plan).expectation(law::itself)) == bits(sample.expectation(law::itself))));

  auto const seeded = sy::with_seed([](std::uint64_t seed) {
    std::mt19937_64 e(seed);
    return std::normal_distribution<double>(1.0, 2.0)(e);
  });
  CHECK(law::errors_off(sy::pipeline{seeded, read_zero}.expectation({.size = 50'000, .seed = 3}, law::itself), 0.2) < 5.0);
}

TEST_CASE("a sampler that hands out a reference to its own state: the state is copied, not emptied") {
  struct grid {
    std::vector<double> cells;
  };
  auto const own = sy::per_worker([] {
    return [g = grid{std::vector<double>(5, 1.0)}](sy::draws& draws) mutable -> grid& {
      for (double& each : g.cells) each = draws.normal();  // never made afresh
      return g;
    };
  });
  auto const read = [](grid const& g) { return law::read_one(g.cells.at(0)); };
  auto const first = [](grid const& g) { return g.cells.at(0); };
  sy::plan const plan{.size = 3000, .seed = 4};
  auto const sample = sy::pipeline{own, read}.run(plan);
  CHECK(sample.states()[2999].cells.size() == 5);
  CHECK((bits(sample.expectation(first)) == bits(sy::pipeline{own, read}.expectation(plan, first))));
  CHECK(sy::pipeline{own, read}.resample(plan, 7)[6].cells.size() == 5);
}

TEST_CASE("states that cannot be copied or made by default, alone and in an optional") {
  struct field {
    explicit field(double x) : cell(std::make_unique<double>(x)) {}
    std::unique_ptr<double> cell;
  };
  auto const draw = [](sy::draws& draws) { return field(draws.normal()); };
  auto const may_fail = [](sy::draws& draws) -> std::optional<field> {
    double const x = draws.normal();
    if (draws.chance(0.2)) return std::nullopt;
    return field(x);
  };
  auto const read = [](field const& f) { return law::read_one(*f.cell); };
  auto const value = [](field const& f) { return *f.cell; };
  for (sy::keeping const keep : {sy::keeping::states, sy::keeping::streams}) {
    sy::plan const plan{.size = 4000, .seed = 5, .threads = 2, .keep = keep, .on_failure = sy::failures::set_aside};
    auto const a = sy::pipeline{draw, read}.run(plan);
    auto const b = sy::pipeline{may_fail, read}.run(plan);
    CHECK(law::errors_off(a.expectation(value), 0.5) < 5.0);
    CHECK(law::errors_off(b.expectation(value), 0.5) < 5.0);
    CHECK(b.size() < 4000);
    auto const chosen = b.resample(50, {.seed = 1});
    CHECK(*chosen[0].cell == b.with_state(chosen.indices()[0], value));
    CHECK(sy::pipeline{may_fail, read}.resample(plan, 50).size() == 50);
  }
}

TEST_CASE("whatever std::invoke takes: member pointers, functions, function objects, std::function") {
  struct tank {
    double level;
    bool full() const { return level > 1.0; }
    sy::log_likelihood explains() const { return law::read_one(level); }
  };
  std::function<tank(sy::draws&)> const draw = [](sy::draws& draws) { return tank{draws.normal()}; };
  sy::pipeline const problem{draw, &tank::explains};
  sy::plan const plan{.size = 2000, .seed = 6};
  auto const sample = problem.run(plan);
  auto const same = sy::pipeline{law::draw_normal, law::read_one}.run(plan);
  CHECK((bits(sample.expectation(&tank::level)) == bits(same.expectation(law::itself))));
  CHECK((bits(sample.probability(&tank::full)) == bits(same.probability(law::above_one))));
  CHECK((bits(problem.probability(plan, &tank::full)) == bits(same.probability(law::above_one))));
}

TEST_CASE("the plan's sizes and counts: any integer type, never a negative one") {
  sy::pipeline const problem{law::draw_normal, law::read_one};
  CHECK(problem.run({.size = 10}).size() == 10);
  CHECK(problem.run({.size = std::size_t{10}}).size() == 10);
  CHECK(problem.run({.size = static_cast<unsigned char>(10)}).size() == 10);
  CHECK(problem.run({.size = 10LL}).size() == 10);
  CHECK(law::said<sy::bad_argument>([] { static_cast<void>(sy::plan{.size = -5}); }) == "count: -5 is negative; a count is zero or more");
  CHECK(law::said<sy::bad_argument>([] { static_cast<void>(sy::plan{.seed = -1LL}); }) == "count: -1 is negative; a count is zero or more");
  CHECK(law::said<sy::bad_argument>([&] { problem.run({.size = 0}); }) == "plan: size is 0; at least one sample is needed");
  CHECK(law::said<sy::bad_argument>([&] { problem.expectation({.size = 0}, law::itself); }) ==
        "plan: size is 0; at least one sample is needed");
  static_assert(!std::is_constructible_v<sy::count, double>);
  static_assert(!std::is_constructible_v<sy::count, bool>);
}
