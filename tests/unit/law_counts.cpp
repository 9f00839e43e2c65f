// SPDX-License-Identifier: BSL-1.0
// A count of m is the state added m times: value, spread, effective size and
// standard error all equal those of the repeated sample. A weight multiplied by m
// shares the value alone.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <limits>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::close;

namespace {

struct counted {
  std::vector<double> states;
  std::vector<std::uint64_t> counts;
  std::vector<std::uint32_t> groups;

  /// The same with every state as often as it counts.
  counted repeated() const {
    counted all;
    for (std::size_t i = 0; i < states.size(); ++i)
      for (std::uint64_t m = 0; m < counts[i]; ++m) {
        all.states.push_back(states[i]);
        if (!groups.empty()) all.groups.push_back(groups[i]);
      }
    return all;
  }
  auto weighed() const { return sy::weigh(states, law::read_one, {.counts = counts, .groups = groups}); }
};

counted drawn(std::size_t n, std::uint64_t most, std::uint64_t seed) {
  sy::draws draws(seed);
  counted all;
  for (std::size_t i = 0; i < n; ++i) {
    all.states.push_back(draws.normal());
    all.counts.push_back(1 + draws.index(most));
  }
  return all;
}

void check_equal(counted const& some, bool carriers_too = true) {
  auto const a = some.weighed(), b = some.repeated().weighed();
  CHECK(a.drawn() == b.drawn());
  CHECK(close(a.diagnosis().effective_size(), b.diagnosis().effective_size(), 1e-11));
  CHECK(close(a.diagnosis().perplexity(), b.diagnosis().perplexity(), 1e-11));
  CHECK(close(a.diagnosis().largest_share(), b.diagnosis().largest_share(), 1e-11));
  auto const same = [&](sy::estimate const& x, sy::estimate const& y) {
    CHECK(close(x.value, y.value, 1e-11));
    CHECK(close(x.standard_error, y.standard_error, 1e-9));
    CHECK(close(x.effective_size, y.effective_size, 1e-11));
    if (carriers_too) CHECK(close(x.carriers, y.carriers, 1e-9));
    CHECK(x.verdict() == y.verdict());
    CHECK(x.error_interval(0.9).upper_known == y.error_interval(0.9).upper_known);
    CHECK(close(x.error_interval(0.9).upper, y.error_interval(0.9).upper, 1e-9));
  };
  same(a.expectation(law::itself), b.expectation(law::itself));
  same(a.probability(law::above_one), b.probability(law::above_one));
  same(a.probability(law::rare), b.probability(law::rare));
  same(a.log_evidence(), b.log_evidence());
  same(a.ratio(law::itself, law::squared), b.ratio(law::itself, law::squared));
  same(a.difference(law::squared, law::itself), b.difference(law::squared, law::itself));
  same(a.quantile(law::itself, 0.5), b.quantile(law::itself, 0.5));
  same(a.quantile(law::itself, 0.9), b.quantile(law::itself, 0.9));
  auto const h = a.histogram(law::itself, sy::equal_bins(-1.0, 2.0, 5)), k = b.histogram(law::itself, sy::equal_bins(-1.0, 2.0, 5));
  for (std::size_t i = 0; i < 5; ++i) {
    same(h.probability(i), k.probability(i));
    same(h.probability_inside(i), k.probability_inside(i));
  }
  same(h.below(), k.below());
  auto const three = a.expectation(law::powers), six = b.expectation(law::powers);
  CHECK(close(three.covariance(0, 2), six.covariance(0, 2), 1e-9));
}

}  // namespace

TEST_CASE("a state that counts twice is the state added twice, for every estimator") {
  counted twice = drawn(900, 1, 1);
  for (auto& m : twice.counts) m = 2;
  check_equal(twice);
}

TEST_CASE("a state that counts m times is the state added m times, over several blocks") {
  check_equal(drawn(40, 5, 2));
  check_equal(drawn(3000, 4, 3));
}

TEST_CASE("counts and groups together: the state added m times to its group") {
  counted grouped = drawn(2000, 3, 4);
  for (std::size_t i = 0; i < grouped.states.size(); ++i) grouped.groups.push_back(static_cast<std::uint32_t>(i % 11 * 1000));
  check_equal(grouped);
  counted many = drawn(2000, 3, 5);
  for (std::size_t i = 0; i < many.states.size(); ++i) many.groups.push_back(static_cast<std::uint32_t>(i % 301));
  check_equal(many);
}

TEST_CASE("the jackknife takes a state that counts m times as m samples") {
  for (auto const& some : {drawn(40, 5, 6), drawn(300, 40, 7), drawn(3000, 3, 8)}) {
    auto const [a, c] = some.weighed().estimate(law::spread(law::itself), law::product(law::itself, law::squared));
    auto const [b, d] = some.repeated().weighed().estimate(law::spread(law::itself), law::product(law::itself, law::squared));
    CHECK(close(a, b, 1e-9));
    CHECK(close(c, d, 1e-9));
  }
}

TEST_CASE("a count of zero is a state that was never drawn, however well it would explain the reading") {
  std::vector<double> const states{0.2, 50.0, 0.7, -60.0, 1.4};
  auto const towers = [](double x) { return sy::log_likelihood{x > 40.0 ? 4000.0 : -0.5 * x * x}; };
  auto const all = sy::weigh(states, towers, {.counts = {2, 0, 1, 0, 3}});
  auto const few = sy::weigh(std::vector<double>{0.2, 0.2, 0.7, 1.4, 1.4, 1.4}, towers);
  CHECK(all.drawn() == 6);
  CHECK(close(all.expectation(law::itself), few.expectation(law::itself)));
  CHECK(close(all.log_evidence(), few.log_evidence()));
  CHECK(all.probability([](double x) { return x > 40.0; }).never_seen());
  CHECK(close(all.diagnosis().largest_share(), few.diagnosis().largest_share()));
  CHECK(all.diagnosis().share_of_zeros() == 0.0);
  CHECK(close(all.reweigh([](double) { return sy::likelihood{1.0}; }).expectation(law::itself).value, 5.3 / 6.0));
  CHECK(close(all.before().expectation(law::itself).value, 5.3 / 6.0));
  auto const chosen = all.resample(100, {.seed = 1});
  for (std::size_t const i : chosen.indices()) CHECK(i % 2 == 0);
  auto const only_elsewhere = [](double x) { return sy::likelihood{x > 40.0 ? 1.0 : 0.0}; };
  CHECK(law::holds(law::said<sy::no_likelihood>([&] { sy::weigh(states, only_elsewhere, {.counts = {2, 0, 1, 0, 3}}); }),
                   "none of the 6 samples drawn can be weighed above zero"));
}

TEST_CASE("a weight doubled is the sample added twice for values, not for errors") {
  counted const some = drawn(500, 3, 9);
  std::vector<double> weights;
  for (auto const m : some.counts) weights.push_back(static_cast<double>(m));
  auto const weighted = sy::weigh(some.states, law::read_one, {.prior_weights = weights});
  auto const repeated = some.repeated().weighed();
  CHECK(close(weighted.expectation(law::itself).value, repeated.expectation(law::itself).value));
  CHECK(close(weighted.probability(law::above_one).value, repeated.probability(law::above_one).value));
  CHECK(close(weighted.log_evidence().value, repeated.log_evidence().value));
  CHECK(close(weighted.ratio(law::itself, law::squared).value, repeated.ratio(law::itself, law::squared).value));
  CHECK(weighted.quantile(law::itself, 0.3).value == repeated.quantile(law::itself, 0.3).value);
  CHECK(weighted.interval(law::itself, 0.8).upper.value == repeated.interval(law::itself, 0.8).upper.value);
  CHECK(weighted.expectation(law::itself).standard_error > 1.2 * repeated.expectation(law::itself).standard_error);
  CHECK(weighted.drawn() == 500);
}

TEST_CASE("every weight doubled changes nothing at all but the evidence of unnormalised weights") {
  counted const some = drawn(3000, 3, 10);
  auto const once = sy::weigh(some.states, [](double x) { return sy::likelihood{1.0 + x * x}; });
  auto const twice = sy::weigh(some.states, [](double x) { return sy::likelihood{2.0 * (1.0 + x * x)}; });
  auto const [a, b] = once.estimate(sy::expectation(law::itself), sy::quantile(law::itself, 0.25));
  auto const [c, d] = twice.estimate(sy::expectation(law::itself), sy::quantile(law::itself, 0.25));
  CHECK(close(a, c, 1e-11));
  CHECK(b.value == d.value);
  CHECK(close(once.log_evidence().value + std::log(2.0), twice.log_evidence().value));
}

TEST_CASE("counts resample like the repeated sample") {
  std::vector<double> const states{0.0, 1.0, 2.0};
  auto const sample = sy::weigh(states, [](double) { return sy::likelihood{1.0}; }, {.counts = {5, 1, 4}});
  auto const drawn = sample.resample(10, {.seed = 1});
  auto const copies = drawn.copies();
  CHECK(copies.size() == 3);
  for (auto const& [i, m] : copies) CHECK(m == (std::vector<std::size_t>{5, 1, 4})[i]);
}
