// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/estimate/probability.hpp>
#include <steelyard/estimate/quantile.hpp>

#include <boost/math/distributions/students_t.hpp>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <vector>

// What an error bar promises rests on the terms that carry it, never on the effective size of the whole sample. The
// numbers 30, 5, 50, 8 and the shares are the library's own rule, kept by the coverage suite.

namespace sy = steelyard;

namespace {

/// An estimate of single samples whose error bar n terms carry, in a sample of this effective size.
sy::estimate carried(double n, double effective_size) {
  sy::run_facts facts;
  facts.drawn = 100'000;
  facts.sum = facts.sum_squares = effective_size;
  return {1.0, {0.04, 0.04 * 0.04 / n, 0.04 / n}, facts};
}
/// From groups, the largest of which makes this share of the sum of squares.
sy::estimate of_groups(double groups, double share, double effective_size) {
  sy::run_facts facts;
  facts.drawn = 100'000;
  facts.sum = facts.sum_squares = effective_size;
  facts.how = sy::how_drawn::labelled;
  facts.groups = groups;
  facts.group_share_squares = 1.0 / groups;
  return {1.0, {0.04, 0.04 * 0.04 * share, 0.04 * share}, facts};
}
sy::estimate share_of(std::size_t hits, std::size_t n) {
  auto const event = [](double x) { return x > 0.5; };
  sy::probability_estimator<decltype(event)> e(event);
  std::vector<double> values(n, 0.0), weights(n, 1.0);
  for (std::size_t i = 0; i < hits; ++i) values[i] = 1.0;
  sy::weighted_view view;
  view.values = values;
  view.weights = weights;
  e.add(values, weights, view);
  sy::run_facts facts;
  facts.drawn = n;
  facts.sum = facts.sum_squares = static_cast<double>(n);
  facts.largest_unit = 1.0 / static_cast<double>(n);
  return e.answer(facts);
}
double t(double level, double degrees) {
  return quantile(complement(boost::math::students_t(degrees), 0.5 * (1.0 - level)));
}

}  // namespace

TEST_CASE("verdict: the terms that carry the error bar decide, and a large sample does not help") {
  CHECK(carried(30.5, 1e4).verdict() == sy::verdict::sound);
  CHECK(carried(29.5, 1e4).verdict() == sy::verdict::strained);
  CHECK(carried(5.5, 1e4).verdict() == sy::verdict::strained);
  CHECK(carried(4.5, 1e4).verdict() == sy::verdict::broken);
  CHECK(carried(1e3, 50.5).verdict() == sy::verdict::sound);
  CHECK(carried(1e3, 49.5).verdict() == sy::verdict::strained);
  CHECK(share_of(10, 10'000).verdict() == sy::verdict::strained);
  CHECK(share_of(40, 10'000).verdict() == sy::verdict::sound);
}

TEST_CASE("verdict: from few groups, by how many there are and how much the largest carries") {
  CHECK(of_groups(8, 0.49, 1e4).verdict() == sy::verdict::sound);
  CHECK(of_groups(7, 0.49, 1e4).verdict() == sy::verdict::strained);
  CHECK(of_groups(8, 0.51, 1e4).verdict() == sy::verdict::strained);
  CHECK(of_groups(8, 0.91, 1e4).verdict() == sy::verdict::broken);
  CHECK(of_groups(8, 0.49, 49.5).verdict() == sy::verdict::strained);
  CHECK(of_groups(12, 0.3, 1e4).degrees_of_freedom == doctest::Approx(11.0));
}

TEST_CASE("error intervals are Student's on the carriers less one") {
  for (double const n : {6.0, 12.0, 40.0, 500.0})
    for (double const level : {0.9, 0.95, 0.99}) {
      sy::estimate const e = carried(n, 1e4);
      CHECK(e.carriers == doctest::Approx(n));
      CHECK(e.degrees_of_freedom == doctest::Approx(n - 1.0));
      sy::interval const i = e.error_interval(level);
      CHECK(i.upper - 1.0 == doctest::Approx(t(level, n - 1.0) * e.standard_error).epsilon(1e-9));
      CHECK(1.0 - i.lower == doctest::Approx(t(level, n - 1.0) * e.standard_error).epsilon(1e-9));
    }
}

TEST_CASE("a probability: binomial error, limits on the logit scale") {
  double const n = 1'000.0, p = 0.03;
  sy::estimate const e = share_of(30, 1'000);
  CHECK(e.standard_error == doctest::Approx(std::sqrt(p * (1.0 - p) / (n - 1.0))).epsilon(1e-12));
  // (sum u^2)^2 / sum u^4 for 30 terms of size q and 970 of size p
  double const q = 1.0 - p, second = 30 * q * q + 970 * p * p, fourth = 30 * q * q * q * q + 970 * p * p * p * p;
  CHECK(e.carriers == doctest::Approx(second * second / fourth).epsilon(1e-12));
  sy::interval const i = e.error_interval(0.95);
  double const reach = t(0.95, e.degrees_of_freedom) * e.standard_error / (p * q), odds = p / q;
  CHECK(i.lower == doctest::Approx(odds * std::exp(-reach) / (1.0 + odds * std::exp(-reach))).epsilon(1e-9));
  CHECK(i.upper == doctest::Approx(odds * std::exp(reach) / (1.0 + odds * std::exp(reach))).epsilon(1e-9));
}

TEST_CASE("never seen and always seen: one-sided limits, and no error bar") {
  // With n equal weights the limit is the exact binomial one, 1 - (1 - level)^(1/n)        [Clopper & Pearson 1934]
  sy::estimate const never = share_of(0, 100), always = share_of(100, 100);
  CHECK(never.never_seen());
  CHECK(never.verdict() == sy::verdict::broken);
  CHECK(never.value == 0.0);
  sy::interval const below = never.error_interval(0.95), above = always.error_interval(0.95);
  CHECK(below.lower == 0.0);
  CHECK(below.upper == doctest::Approx(1.0 - std::pow(0.05, 0.01)).epsilon(1e-12));
  CHECK(always.always_seen());
  CHECK(always.verdict() == sy::verdict::broken);
  CHECK(above.lower == doctest::Approx(std::pow(0.05, 0.01)).epsilon(1e-12));
  CHECK(above.upper == 1.0);
}

namespace {

/// A quantile of values of equal weight.
sy::quantile_result quantile_of(std::vector<double> const& values, double p) {
  auto const itself = [](double x) { return x; };
  sy::quantile_estimator<decltype(itself)> e(itself, p);
  std::vector<double> const weights(values.size(), 1.0);
  sy::weighted_view view;
  view.values = values;
  view.weights = weights;
  e.add(values, weights, view);
  sy::run_facts facts;
  facts.drawn = values.size();
  facts.sum = facts.sum_squares = static_cast<double>(values.size());
  return e.answer(facts);
}

}  // namespace

TEST_CASE("an end of a quantile's limits with too little beyond it is unknown, not clipped") {
  auto const of_twenty = [](double p) {
    std::vector<double> values;
    for (int i = 1; i <= 20; ++i) values.push_back(i);
    return quantile_of(values, p);
  };
  // F(18) = 0.9 with se sqrt(0.09/19) = 0.069: twice that reaches past 1 above, and to F = 0.75 or less below
  sy::interval const high = of_twenty(0.9).error_interval(0.95), low = of_twenty(0.1).error_interval(0.95);
  CHECK_FALSE(high.upper_known);
  CHECK(high.lower_known);
  CHECK(high.lower <= 15.0);
  CHECK_FALSE(low.lower_known);
  CHECK(low.upper_known);
  CHECK(of_twenty(0.9).verdict() != sy::verdict::sound);
  sy::interval const middle = of_twenty(0.5).error_interval(0.95);
  CHECK(middle.lower_known);
  CHECK(middle.upper_known);
  CHECK(middle.lower < 10.0);
  CHECK(middle.upper > 10.0);
}

TEST_CASE("a quantile is sound only where its standard error tells how far limits reach") {
  // Two clusters of 2000 at -1 and 1, each 0.2 wide. F has standard error 0.0079 in the middle.
  std::vector<double> values;
  for (int i = 0; i < 4000; ++i) values.push_back((i < 2000 ? -1.1 : 0.9) + 0.2 * (i % 2000) / 2000.0);
  CHECK(quantile_of(values, 0.25).verdict() == sy::verdict::sound);
  CHECK(quantile_of(values, 0.75).verdict() == sy::verdict::sound);
  // Two standard errors below the gap: the error bar knows one cluster, three standard errors reach the other.
  sy::quantile_result const below = quantile_of(values, 0.484);
  CHECK(below.standard_error < 0.01);
  CHECK(below.verdict() == sy::verdict::strained);
  // At the gap: the error bar is the gap, and further limits reach no further.
  sy::quantile_result const at = quantile_of(values, 0.5);
  CHECK(at.standard_error > 0.5);
  CHECK(at.verdict() == sy::verdict::strained);
  // Far enough from it all is well again.
  CHECK(quantile_of(values, 0.46).verdict() == sy::verdict::sound);
}
