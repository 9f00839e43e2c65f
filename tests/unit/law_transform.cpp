// SPDX-License-Identifier: BSL-1.0
// What must not matter, and what must follow: a constant on every log-likelihood,
// the order of the states, states split in two, shift and scale of a readout, and
// where an accumulation was cut.

#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::bits;
using law::close;

namespace {

std::vector<double> normals(std::size_t n, std::uint64_t seed) {
  sy::draws draws(seed);
  std::vector<double> all;
  for (std::size_t i = 0; i < n; ++i) all.push_back(draws.normal());
  return all;
}

/// A log-likelihood in steps of 2^-20, to which whole numbers below 2^32 are added without rounding.
double stepped(double x) { return std::round(-0.5 * (1.0 - x) * (1.0 - x) * 0x1p20) * 0x1p-20; }

/// Calls check(name, answer of a, answer of b) for each scalar answer of two samples.
template <class A, class B, class Check>
void each_estimate(A const& a, B const& b, Check check) {
  auto const x = law::ask_everything(a), y = law::ask_everything(b);
  check("expectation", x.template get<0>(), y.template get<0>());
  for (std::size_t k = 0; k < 3; ++k) check("powers", x.template get<1>()[k], y.template get<1>()[k]);
  check("probability", x.template get<2>(), y.template get<2>());
  check("rare", x.template get<3>(), y.template get<3>());
  for (std::size_t k = 0; k < 7; ++k) check("bin", x.template get<5>().probability(k), y.template get<5>().probability(k));
  check("ratio", x.template get<8>(), y.template get<8>());
  check("difference", x.template get<9>(), y.template get<9>());
  check("spread", x.template get<10>(), y.template get<10>());
  check("product", x.template get<11>(), y.template get<11>());
  check("median", x.template get<12>(), y.template get<12>());
  check("upper end", x.template get<14>().upper, y.template get<14>().upper);
}

}  // namespace

TEST_CASE("a constant added to every log-likelihood moves only the evidence") {
  std::vector<double> const states = normals(5000, 1);
  auto const plain = sy::weigh(states, [](double x) { return sy::log_likelihood{stepped(x)}; });
  auto const answers = law::ask_everything(plain);
  for (double const c : {1.0, -700.0, 700.0, 1e5, -1e5}) {
    CAPTURE(c);
    auto const moved = sy::weigh(states, [c](double x) { return sy::log_likelihood{stepped(x) + c}; });
    auto const same = law::ask_everything(moved);
    auto const evidence = plain.log_evidence(), other = moved.log_evidence();
    CHECK(other.value - c == doctest::Approx(evidence.value).epsilon(1e-15 * std::abs(c) + 1e-14));
    CHECK(other.standard_error == evidence.standard_error);
    CHECK(other.carriers == evidence.carriers);
    CHECK((bits(same.get<0>()) == bits(answers.get<0>())));
    CHECK((bits(same.get<1>()) == bits(answers.get<1>())));
    CHECK((bits(same.get<2>()) == bits(answers.get<2>())));
    CHECK((bits(same.get<4>()) == bits(answers.get<4>())));
    CHECK((bits(same.get<5>()) == bits(answers.get<5>())));
    CHECK((bits(same.get<6>()) == bits(answers.get<6>())));
    CHECK((bits(same.get<8>()) == bits(answers.get<8>())));
    CHECK((bits(same.get<9>()) == bits(answers.get<9>())));
    CHECK((bits(same.get<10>()) == bits(answers.get<10>())));
    CHECK((bits(same.get<11>()) == bits(answers.get<11>())));
    CHECK((bits(same.get<12>()) == bits(answers.get<12>())));
    CHECK((bits(same.get<14>()) == bits(answers.get<14>())));
    CHECK((bits(same.diagnosis()) == bits(answers.diagnosis())));
  }
}

TEST_CASE("a constant that rounds each log-likelihood moves answers by no more than |c| 2^-53 a weight") {
  std::vector<double> const states = normals(5000, 2);
  auto const plain = sy::weigh(states, [](double x) { return sy::log_likelihood{-0.5 * (1.0 - x) * (1.0 - x)}; });
  for (double const c : {0.1, -700.3, 700.3, 1e5 / 3.0, -1e5 / 3.0}) {
    CAPTURE(c);
    auto const moved = sy::weigh(states, [c](double x) { return sy::log_likelihood{c - 0.5 * (1.0 - x) * (1.0 - x)}; });
    double const most = 1e-13 + 4.0 * std::abs(c) * 0x1p-53;
    each_estimate(plain, moved, [&](char const* name, sy::estimate const& a, sy::estimate const& b) {
      CAPTURE(name);
      CHECK(close(a, b, 100.0 * most));  // a mean near zero is compared to its own size
      CHECK(std::abs(a.value - b.value) < 1e-6 * a.standard_error);
    });
    CHECK(std::abs(moved.log_evidence().value - c - plain.log_evidence().value) < most);
  }
}

TEST_CASE("a constant prior log-weight changes nothing, the evidence included") {
  std::vector<double> const states = normals(3000, 3);
  auto const plain = sy::weigh(states, law::read_one);
  for (double const b : {-1e5, 3.0, 1e5}) {
    CAPTURE(b);
    auto const moved = sy::weigh(states, law::read_one, {.log_prior_weights = std::vector<double>(states.size(), b)});
    CHECK(close(plain.log_evidence(), moved.log_evidence(), 1e-9));
    CHECK(close(plain.expectation(law::itself), moved.expectation(law::itself), 1e-9));
    CHECK(close(plain.before().expectation(law::squared), moved.before().expectation(law::squared), 1e-12));
  }
}

TEST_CASE("the order of the states changes no answer") {
  std::vector<double> states = normals(5000, 4);
  auto const sample = sy::weigh(states, law::read_one);
  sy::draws draws(5);
  sy::detail::shuffle(states, draws);
  auto const shuffled = sy::weigh(states, law::read_one);
  each_estimate(sample, shuffled, [](char const* name, sy::estimate const& a, sy::estimate const& b) {
    CAPTURE(name);
    if (std::string_view(name) == "spread")  // its error comes from groups of neighbours
      CHECK(close(a.value, b.value, 1e-10));
    else
      CHECK(close(a, b, 1e-10));
  });
  CHECK(close(sample.log_evidence(), shuffled.log_evidence(), 1e-10));
  CHECK(close(sample.diagnosis().perplexity(), shuffled.diagnosis().perplexity(), 1e-10));
}

TEST_CASE("every state split into two of half its weight: the same values, and in one group the same errors") {
  std::vector<double> const states = normals(2000, 6);
  std::vector<double> halves;
  std::vector<std::uint32_t> labels, of_halves;
  for (std::size_t i = 0; i < states.size(); ++i) {
    labels.push_back(static_cast<std::uint32_t>(i / 10));
    for (int k = 0; k < 2; ++k) {
      halves.push_back(states[i]);
      of_halves.push_back(labels.back());
    }
  }
  auto const half = [](double x) { return sy::likelihood{0.5 * std::exp(-0.5 * (1.0 - x) * (1.0 - x))}; };
  auto const alone = sy::weigh(states, law::read_one), split = sy::weigh(halves, half);
  each_estimate(alone, split, [](char const* name, sy::estimate const& a, sy::estimate const& b) {
    CAPTURE(name);
    if (std::string_view(name) != "spread") CHECK(close(a.value, b.value, 1e-10));  // Kish counts the halves
  });
  auto const grouped = sy::weigh(states, law::read_one, {.groups = labels});
  auto const split_groups = sy::weigh(halves, half, {.groups = of_halves});
  CHECK(split_groups.expectation(law::itself).effective_size > 1.9 * grouped.expectation(law::itself).effective_size);
  auto const same = [&](sy::estimate const& a, sy::estimate const& b) {
    CHECK(close(a.value, b.value, 1e-10));
    CHECK(close(a.standard_error, b.standard_error, 1e-10));
    CHECK(close(a.carriers, b.carriers, 1e-10));
  };
  same(grouped.expectation(law::itself), split_groups.expectation(law::itself));
  same(grouped.probability(law::above_one), split_groups.probability(law::above_one));
  same(grouped.ratio(law::itself, law::squared), split_groups.ratio(law::itself, law::squared));
  same(grouped.difference(law::itself, law::squared), split_groups.difference(law::itself, law::squared));
  CHECK(grouped.quantile(law::itself, 0.4).value == split_groups.quantile(law::itself, 0.4).value);
  CHECK(close(grouped.quantile(law::itself, 0.4).standard_error, split_groups.quantile(law::itself, 0.4).standard_error));
}

TEST_CASE("shift and scale of the readout carry through: values, errors and carriers") {
  auto const sample = sy::weigh(normals(4000, 7), law::read_one);
  for (auto const& change : {std::pair{0.0, -3.0}, std::pair{1000.0, 0.5}, std::pair{-7e6, 2e4}}) {
    double const shift = change.first, scale = change.second;
    CAPTURE(shift);
    auto const moved = [shift, scale](double x) { return shift + scale * x; };
    auto const follows = [&](sy::estimate const& plain, sy::estimate const& other) {
      CHECK(close(other.value, shift + scale * plain.value, 1e-12));
      CHECK(close(other.standard_error, std::abs(scale) * plain.standard_error, 1e-7));
      CHECK(close(other.carriers, plain.carriers, 1e-6));
      CHECK(other.effective_size == plain.effective_size);
      CHECK(other.verdict() == plain.verdict());
    };
    follows(sample.expectation(law::itself), sample.expectation(moved));
    auto const plain = sample.quantile(law::itself, scale > 0.0 ? 0.3 : 0.7), other = sample.quantile(moved, 0.3);
    if (scale > 0.0) follows(plain, other);
    CHECK(close(other.standard_error, std::abs(scale) * plain.standard_error, 1e-2));
    auto const gap = sample.difference(moved, law::itself);
    CHECK(close(gap.value, shift + (scale - 1.0) * sample.expectation(law::itself).value, 1e-12));
    CHECK(close(gap.standard_error, std::abs(scale - 1.0) * sample.expectation(law::itself).standard_error, 1e-7));
    auto const bins = sample.histogram(law::itself, sy::equal_bins(-1.0, 2.0, 6));
    auto const moved_bins = sample.histogram(moved, sy::equal_bins(scale > 0.0 ? shift - scale : shift + 2.0 * scale,
                                                                   scale > 0.0 ? shift + 2.0 * scale : shift - scale, 6));
    for (std::size_t b = 0; b < 6; ++b)
      CHECK(close(bins.probability(b).value, moved_bins.probability(scale > 0.0 ? b : 5 - b).value, 1e-10));
  }
  auto const ratio = sample.ratio(law::squared, law::squared);
  CHECK(ratio.value == 1.0);
  CHECK(ratio.standard_error == 0.0);
  CHECK(ratio.verdict() == sy::verdict::broken);
  auto const scaled = sample.ratio([](double x) { return -4.0 * x; }, law::squared), once = sample.ratio(law::itself, law::squared);
  CHECK(close(scaled.value, -4.0 * once.value));
  CHECK(close(scaled.standard_error, 4.0 * once.standard_error));
  CHECK(close(scaled.carriers, once.carriers, 1e-10));
}

namespace {

struct piece {
  std::vector<double> values, weights;
  std::vector<std::uint32_t> groups;
  sy::weighted_view view() const { return {.values = values, .weights = weights, .counts = {}, .groups = groups, .base_weights = {}}; }
};

/// What an estimator answers after one add, and after `parts` adds merged, one of them on another scale of weights.
template <class Estimator>
void check_merge(Estimator const& empty, std::size_t columns, bool grouped, bool event = false) {
  std::size_t const n = 999;
  std::vector<double> const numbers = normals(3 * n, 8);
  auto const part = [&](std::size_t from, std::size_t to, double scale) {
    piece p;
    for (std::size_t c = 0; c < columns; ++c)
      for (std::size_t i = from; i < to; ++i) p.values.push_back(event ? (numbers[i] > 0.3 ? 1.0 : 0.0) : c == 0 ? numbers[i] : 2.0 + numbers[i] * numbers[n + i]);
    for (std::size_t i = from; i < to; ++i) {
      p.weights.push_back(scale * std::exp(numbers[2 * n + i]));
      if (grouped) p.groups.push_back(static_cast<std::uint32_t>(i % 90));
    }
    return p;
  };
  auto const add = [&](Estimator& to, piece const& p) { to.add(p.values, p.weights, p.view()); };
  sy::run_facts facts;
  facts.drawn = n;
  for (double const w : part(0, n, 1.0).weights) {
    facts.sum += w;
    facts.sum_squares += w * w;
  }
  facts.groups = grouped ? 90.0 : 0.0;
  facts.group_share_squares = grouped ? 1.0 / 90.0 : 0.0;
  facts.how = grouped ? sy::how_drawn::labelled : sy::how_drawn::independent;

  Estimator whole = empty.fresh(), left = empty.fresh(), right = empty.fresh(), last = empty.fresh();
  add(whole, part(0, n, 1.0));
  add(left, part(0, 100, 1.0));
  add(right, part(100, 700, 1024.0));
  right.rescale(1.0 / 1024.0);
  add(last, part(700, n, 1.0));
  right += last;
  right += empty.fresh();
  left += right;
  Estimator from_nothing = empty.fresh();
  from_nothing += left;
  CHECK(close(from_nothing.answer(facts), whole.answer(facts), 1e-9));
}

}  // namespace

TEST_CASE("merge = one pass: parts added up and joined answer as the whole does") {
  for (bool const grouped : {false, true}) {
    CAPTURE(grouped);
    check_merge(sy::expectation(law::itself), 1, grouped);
    check_merge(sy::probability(law::above_one), 1, grouped, true);
    check_merge(sy::ratio(law::itself, law::itself), 2, grouped);
    check_merge(sy::difference(law::itself, law::itself), 2, grouped);
  }
  check_merge(law::product(law::itself, law::itself), 2, false);
}
