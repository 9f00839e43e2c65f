// SPDX-License-Identifier: BSL-1.0
// Resampling schemes: exact variances, copies, inclusion probabilities, unbiased
// weights, alias tables rebuilt, and what an ensemble says of its own error.

#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <map>
#include <numeric>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
namespace detail = steelyard::detail;
using law::close;
using law::itself;

namespace {

constexpr sy::scheme with_replacement[] = {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified,
                                           sy::scheme::residual};
constexpr sy::scheme without_replacement[] = {sy::scheme::priority, sy::scheme::successive};

sy::likelihood flat(double) { return sy::likelihood{1.0}; }

/// Moments of what a function of the seed returns.
struct spread {
  double n = 0.0, mean = 0.0, second = 0.0, fourth = 0.0;
  std::vector<double> all;
  void add(double x) { all.push_back(x); }
  void settle() {
    n = static_cast<double>(all.size());
    mean = std::accumulate(all.begin(), all.end(), 0.0) / n;
    for (double const x : all) {
      second += (x - mean) * (x - mean) / n;
      fourth += std::pow(x - mean, 4) / n;
    }
  }
  double mean_error() const { return std::sqrt(second / n); }
  double variance_error() const { return std::sqrt((fourth - second * second) / n); }
};

}  // namespace

TEST_CASE("resampling: exact variances of the mean, Douc, Cappe & Moulines 2005") {
  std::vector<double> const w{0.1, 0.2, 0.3, 0.4}, f{0.0, 1.0, 2.0, 3.0};
  auto const exact = [&](sy::scheme how) { return detail::resampling_variance(how, w, f, 4); };
  CHECK(exact(sy::scheme::multinomial) == doctest::Approx(0.25).epsilon(1e-14));
  CHECK(exact(sy::scheme::residual) == doctest::Approx(0.15625).epsilon(1e-13));
  CHECK(exact(sy::scheme::stratified) == doctest::Approx(0.04).epsilon(1e-13));
  CHECK(exact(sy::scheme::systematic) == doctest::Approx(0.1).epsilon(1e-13));
  // Where steps and order agree, one uniform number does worse than independent draws.
  std::vector<double> const quarter(4, 0.25), turn{1.0, 0.0, 1.0, 0.0};
  CHECK(detail::resampling_variance(sy::scheme::multinomial, quarter, turn, 2) ==
        doctest::Approx(0.125).epsilon(1e-14));
  CHECK(detail::resampling_variance(sy::scheme::systematic, quarter, turn, 2) == doctest::Approx(0.25).epsilon(1e-14));
  CHECK(detail::resampling_variance(sy::scheme::stratified, quarter, turn, 2) == doctest::Approx(0.125).epsilon(1e-14));
}

TEST_CASE("resampling: variances do not depend on the unit of the weights, and zero weights count for nothing") {
  std::vector<double> const w{0.0, 3.0, 0.0, 5.0, 1.0, 0.0, 7.0, 0.0}, f{9.0, 1.0, -9.0, 2.5, -1.0, 9.0, 0.5, 99.0};
  std::vector<double> some, same;
  for (std::size_t i = 0; i < w.size(); ++i)
    if (w[i] > 0.0) {
      some.push_back(w[i] * 1e-200);
      same.push_back(f[i]);
    }
  for (sy::scheme const how : with_replacement)
    for (std::size_t const k : {1u, 2u, 5u, 16u, 33u}) {
      CAPTURE(k);
      CHECK(detail::resampling_variance(how, w, f, k) ==
            doctest::Approx(detail::resampling_variance(how, some, same, k)).epsilon(1e-12));
    }
}

TEST_CASE("resampling: copies and means of the draws are unbiased and vary as the exact formula says") {
  std::vector<double> const w{0.5, 2.0, 0.0, 1.25, 3.0, 0.25}, f{4.0, -1.0, 100.0, 2.0, 0.5, -8.0};
  double const total = 7.0;
  std::uint64_t const repeats = 20'000;
  for (sy::scheme const how : with_replacement)
    for (std::size_t const k : {3u, 10u}) {
      CAPTURE(static_cast<int>(how));
      CAPTURE(k);
      std::array<spread, 6> copies;
      spread means;
      for (std::uint64_t r = 0; r < repeats; ++r) {
        sy::draws source(77, r);
        auto const drawn = detail::draw_slots(how, w, k, source);
        REQUIRE(drawn.positions.size() == k);
        CHECK(drawn.weights.empty());
        REQUIRE(std::is_sorted(drawn.positions.begin(), drawn.positions.end()));
        std::array<double, 6> counts{};
        double mean = 0.0;
        for (std::size_t const i : drawn.positions) {
          counts[i] += 1.0;
          mean += f[i] / static_cast<double>(k);
        }
        for (std::size_t i = 0; i < 6; ++i) copies[i].add(counts[i]);
        means.add(mean);
        if (how == sy::scheme::multinomial) continue;
        for (std::size_t i = 0; i < 6; ++i) {  // what cannot vary more than the scheme lets it
          double const expected = static_cast<double>(k) * w[i] / total;
          CHECK(counts[i] >= std::floor(expected) - (how == sy::scheme::stratified ? 1.0 : 0.0));
          if (how == sy::scheme::systematic) CHECK(counts[i] <= std::ceil(expected));
          if (how == sy::scheme::stratified) CHECK(counts[i] <= std::ceil(expected) + 1.0);
        }
      }
      for (std::size_t i = 0; i < 6; ++i) {
        copies[i].settle();
        CHECK(std::abs(copies[i].mean - static_cast<double>(k) * w[i] / total) <= 5.0 * copies[i].mean_error() + 1e-12);
      }
      means.settle();
      double const exact = detail::resampling_variance(how, w, f, k);
      CHECK(std::abs(means.mean - (0.5 * 4.0 - 2.0 + 2.5 + 1.5 - 2.0) / total) <= 5.0 * means.mean_error());
      CHECK(std::abs(means.second - exact) <= 5.0 * means.variance_error());
    }
}

TEST_CASE("resampling: residual keeps whole copies for certain, however rounding falls") {
  for (std::size_t n = 1; n < 200; ++n) {
    std::vector<double> const equal(n, 0.1);
    auto const split = detail::split_residual(equal, n);
    CHECK(split.kept.size() == n);
    CHECK(detail::residual_variance(equal, equal, 3 * n) == 0.0);
  }
}

TEST_CASE("resampling: inclusion without replacement") {
  // weights 1, 2, 3, two kept. Successive draws: 5/12, 11/15, 17/20 (Efraimidis & Spirakis 2006). Priority, keys w/U:
  // item i is left out when U_i/w_i is the largest of three independent uniforms on (0, 1/w): 77/108, 23/108, 8/108 by
  // hand.
  std::vector<double> const w{1.0, 2.0, 3.0};
  std::array<std::array<double, 3>, 2> const exact{
      {{31.0 / 108.0, 85.0 / 108.0, 100.0 / 108.0}, {5.0 / 12.0, 11.0 / 15.0, 17.0 / 20.0}}};
  std::uint64_t const repeats = 60'000;
  for (std::size_t s = 0; s < 2; ++s) {
    std::array<double, 3> seen{};
    for (std::uint64_t r = 0; r < repeats; ++r) {
      sy::draws source(5, r);
      for (std::size_t const i : detail::draw_slots(without_replacement[s], w, 2, source).positions) seen[i] += 1.0;
    }
    for (std::size_t i = 0; i < 3; ++i) {
      double const p = exact[s][i], n = static_cast<double>(repeats);
      CHECK(std::abs(seen[i] / n - p) <= 5.0 * std::sqrt(p * (1.0 - p) / n));
    }
  }
  // One at a time from an alias table, repeats passed over, is the second of them.
  detail::alias_table const table(w);
  std::array<double, 3> seen{};
  for (std::uint64_t r = 0; r < repeats; ++r) {
    sy::draws source(6, r);
    std::size_t const first = table.draw(source);
    std::size_t second = first;
    while (second == first) second = table.draw(source);
    seen[first] += 1.0;
    seen[second] += 1.0;
  }
  for (std::size_t i = 0; i < 3; ++i) {
    double const p = exact[1][i], n = static_cast<double>(repeats);
    CHECK(std::abs(seen[i] / n - p) <= 5.0 * std::sqrt(p * (1.0 - p) / n));
  }
}

TEST_CASE("resampling: weights of a draw without replacement are unbiased and uncorrelated") {
  // Duffield, Lund & Thorup 2007: E of each estimated weight is the weight, and the covariance of two is zero.
  std::vector<double> const w{0.2, 5.0, 1.0, 1.0, 0.0, 3.0, 0.7};
  double const total = 10.9;
  for (sy::scheme const how : without_replacement)
    for (std::size_t const k : {2u, 4u, 6u, 9u}) {
      CAPTURE(static_cast<int>(how));
      CAPTURE(k);
      std::array<spread, 7> of;
      spread product;
      for (std::uint64_t r = 0; r < 40'000; ++r) {
        sy::draws source(8, r);
        auto const drawn = detail::draw_slots(how, w, k, source);
        REQUIRE(drawn.positions.size() == std::min<std::size_t>(k, 6));
        REQUIRE(drawn.weights.size() == drawn.positions.size());
        std::array<double, 7> estimated{};
        for (std::size_t s = 0; s < drawn.positions.size(); ++s) {
          CHECK(estimated[drawn.positions[s]] == 0.0);
          estimated[drawn.positions[s]] = drawn.weights[s];
        }
        for (std::size_t i = 0; i < 7; ++i) of[i].add(estimated[i]);
        product.add((estimated[0] - w[0] / total) * (estimated[3] - w[3] / total));
      }
      for (std::size_t i = 0; i < 7; ++i) {
        of[i].settle();
        if (k >= 6) CHECK(close(of[i].all.front(), w[i] / total, 1e-14));  // everything kept: exact
        CHECK(std::abs(of[i].mean - w[i] / total) <= 5.0 * of[i].mean_error() + 1e-12);
      }
      product.settle();
      CHECK(std::abs(product.mean) <= 5.0 * product.mean_error() + 1e-15);
    }
}

TEST_CASE("resampling: an alias table rebuilds its probabilities exactly") {
  for (std::size_t const n : {1u, 2u, 3u, 4u, 7u, 64u, 1000u, 4097u}) {
    CAPTURE(n);
    std::vector<double> w;
    for (std::size_t i = 0; i < n; ++i) {
      sy::draws draws(3, i);
      w.push_back(i % 5 == 3 && n > 5 ? 0.0 : std::pow(draws.uniform(), 6.0));
    }
    detail::alias_table const table(w);
    std::vector<std::uint64_t> rebuilt(n, 0);
    for (std::size_t i = 0; i < n; ++i) {
      REQUIRE(table.own(i) <= table.capacity());
      rebuilt[i] += table.own(i);
      rebuilt[table.alias(i)] += table.capacity() - table.own(i);
    }
    CHECK(rebuilt == table.shares_of(w));
    double total = 0.0;
    std::uint64_t whole = 0;
    for (std::size_t i = 0; i < n; ++i) {
      total += w[i];
      whole += rebuilt[i];
    }
    CHECK(whole == n * table.capacity());
    for (std::size_t i = 0; i < n; ++i) {
      CHECK(std::abs(static_cast<double>(rebuilt[i]) / static_cast<double>(whole) - w[i] / total) <= 1e-15);
      if (w[i] == 0.0) CHECK(rebuilt[i] == 0);
    }
  }
  // Weights that are whole multiples of a power of two: p = share / (n capacity) holds to the last bit.
  std::vector<double> const dyadic{1.0, 3.0, 5.0, 7.0};
  detail::alias_table const table(dyadic);
  auto const shares = table.shares_of(dyadic);
  for (std::size_t i = 0; i < 4; ++i) CHECK(shares[i] == (2 * i + 1) * (table.capacity() / 4));
}

TEST_CASE("resampling: picks follow the weights, and a picker is a sampler") {
  std::vector<double> const states{10.0, 20.0, 30.0, 40.0}, prior{1.0, 0.0, 3.0, 4.0};
  auto const sample = sy::weigh(states, flat, {.prior_weights = prior});
  sy::picker const pick{sample};
  sy::draws source(4);
  std::map<double, double> seen;
  double const n = 80'000.0;
  for (int i = 0; i < 80'000; ++i) seen[pick(source)] += 1.0;
  CHECK(source.words_used() == 80'000);
  CHECK(seen.count(20.0) == 0);
  for (std::size_t i : {0u, 2u, 3u}) {
    double const p = prior[i] / 8.0;
    CHECK(std::abs(seen[states[i]] / n - p) <= 5.0 * std::sqrt(p * (1.0 - p) / n));
  }
  CHECK(&pick(source) >= sample.states().data());
  static_assert(sy::sampler<sy::picker<double>>);
  auto const next = sy::pipeline{pick, [](double x) { return sy::likelihood{x}; }}.estimate({.size = 50'000},
                                                                                            sy::expectation(itself));
  // E x^2 / E x over the weights
  CHECK(law::errors_off(next.get<0>(), (100.0 + 3.0 * 900.0 + 4.0 * 1600.0) / (10.0 + 90.0 + 160.0)) < 5.0);
  auto const counted = sy::weigh(states, flat, {.prior_weights = prior, .counts = {8, 9, 1, 1}});
  sy::draws other(5);
  double ten = 0.0;
  sy::picker const pick_counted{counted};
  for (int i = 0; i < 20'000; ++i) ten += pick_counted(other) == 10.0 ? 1.0 : 0.0;
  CHECK(std::abs(ten / 20'000.0 - 8.0 / 15.0) < 0.02);
}

TEST_CASE("resampling: a picker of a sample that kept its streams only gives positions") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const sample = pipe.run({.size = 300, .keep = sy::keeping::streams});
  sy::picker const pick{sample};
  sy::draws source(1);
  CHECK(pick.index(source) < 300);
  CHECK(law::holds(law::said<sy::not_kept>([&] { pick(source); }), "picker: this sample kept its streams only"));
}

TEST_CASE("resampling: the same seed gives the same slots, shuffled or not, kept or replayed") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const kept = pipe.run({.size = 3000, .seed = 2}),
             replayed = pipe.run({.size = 3000, .seed = 2, .keep = sy::keeping::streams});
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified,
                               sy::scheme::residual, sy::scheme::priority, sy::scheme::successive}) {
    CAPTURE(static_cast<int>(how));
    auto const a = kept.resample(500, {.seed = 3, .scheme = how}),
               b = replayed.resample(500, {.seed = 3, .scheme = how});
    auto const plain = kept.resample(500, {.seed = 3, .scheme = how, .shuffled = false});
    CHECK(std::vector<std::size_t>(a.indices().begin(), a.indices().end()) ==
          std::vector<std::size_t>(b.indices().begin(), b.indices().end()));
    CHECK(a.copies() == plain.copies());
    CHECK(std::is_sorted(plain.indices().begin(), plain.indices().end()));
    CHECK_FALSE(std::is_sorted(a.indices().begin(), a.indices().end()));
    CHECK(a.weights().size() == (how == sy::scheme::priority || how == sy::scheme::successive ? 500u : 0u));
    for (std::size_t s = 0; s < 500; ++s) {
      CHECK(a[s] == kept.states()[a.indices()[s]]);
      CHECK(a[s] == b[s]);
      if (a.weights().empty()) continue;
      auto const at =
          std::lower_bound(plain.indices().begin(), plain.indices().end(), a.indices()[s]) - plain.indices().begin();
      CHECK(a.weights()[s] == plain.weights()[static_cast<std::size_t>(at)]);
    }
    CHECK(close(a.expectation(itself), b.expectation(itself), 1e-12));
    CHECK(close(a.as_sample().expectation(itself), b.as_sample().expectation(itself), 1e-12));
  }
}

TEST_CASE("resampling: an ensemble's error is the parent's and the draw's, and its distinct states say the same") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const sample = pipe.run({.size = 20'000, .seed = 4});
  double const parent = sample.expectation(itself).standard_error, sd = std::sqrt(0.5);  // posterior N(0.5, 0.5)
  auto const drawn = sample.resample(2000, {.scheme = sy::scheme::multinomial});
  double const expected = std::sqrt(parent * parent + sd * sd / 2000.0);
  CHECK(drawn.expectation(itself).standard_error == doctest::Approx(expected).epsilon(0.02));
  for (sy::scheme const how : {sy::scheme::multinomial, sy::scheme::stratified, sy::scheme::systematic,
                               sy::scheme::priority, sy::scheme::successive}) {
    CAPTURE(static_cast<int>(how));
    auto const all = sample.resample(2000, {.scheme = how});
    auto const [mean, median, moments, share] = all.estimate(sy::expectation(itself), sy::quantile(itself, 0.5),
                                                             sy::moments(itself), sy::probability(law::above_one));
    CHECK(mean.standard_error == doctest::Approx(expected).epsilon(0.08));
    CHECK(law::errors_off(mean, 0.5) < 5.0);
    CHECK(law::errors_off(median, 0.5) < 5.0);
    CHECK(law::errors_off(moments.sd, sd) < 5.0);
    CHECK(law::errors_off(share, 0.2397500610934768) < 5.0);  // P(N(0.5, 0.5) > 1)
    CHECK(all.histogram(itself, sy::equal_bins(-1.0, 2.0, 3)).probability(1).value > 0.3);
    CHECK(all.quantile(itself, 0.5).value == median.value);
    CHECK(all.interval(itself, 0.9).lower.value < -0.4);
  }
  // Without the parent at hand, after one pass.
  auto const streamed = pipe.resample({.size = 20'000, .seed = 4}, 2000);
  auto const [mean] = streamed.estimate(sy::expectation(itself));
  CHECK(mean.value == doctest::Approx(streamed.expectation(itself).value).epsilon(1e-12));
  CHECK(mean.standard_error == doctest::Approx(expected).epsilon(0.08));
  CHECK(streamed.expectation([](double x) { return std::array{x, x * x}; })[1].standard_error > 0.0);
}

TEST_CASE("resampling: an ensemble is what was known before a further reading") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const before =
      pipe.run({.size = 50'000, .seed = 6}).resample(20'000, {.scheme = sy::scheme::stratified}).as_sample();
  CHECK(before.log_evidence().value == doctest::Approx(0.0).epsilon(1e-12));
  auto const after = before.reweigh(law::read_one);
  CHECK(law::errors_off(after.expectation(itself), 2.0 / 3.0) < 5.0);  // two readings of 1 and the prior N(0, 1)
  // sqrt(2 pi) N(1; 0.5, 1.5)
  CHECK(law::errors_off(after.log_evidence(), -0.5 * std::log(1.5) - 0.25 / 3.0) < 5.0);
}

TEST_CASE("resampling: groups of the parent stay groups") {
  std::vector<double> states;
  std::vector<std::uint32_t> groups;
  for (std::size_t i = 0; i < 4000; ++i) {
    sy::draws own(9, i), shared(10, i / 100);
    states.push_back(own.normal() + 3.0 * shared.normal());
    groups.push_back(static_cast<std::uint32_t>(i / 100));
  }
  auto const sample = sy::weigh(states, flat, {.groups = groups});
  auto const alone = sy::weigh(states, flat);
  double const with = sample.expectation(itself).standard_error;
  CHECK(with > 3.0 * alone.expectation(itself).standard_error);
  auto const ensemble = sample.resample(2000).as_sample();
  CHECK(ensemble.how_drawn() == sy::how_drawn::labelled);
  CHECK(ensemble.expectation(itself).standard_error == doctest::Approx(with).epsilon(0.05));
  CHECK(ensemble.expectation(itself).groups() == 40.0);
}

TEST_CASE("resampling: counted states draw like the repeated sample, errors too") {
  std::vector<double> const states{0.0, 1.0, 3.0, 4.0};
  auto const counted = sy::weigh(states, flat, {.counts = {2000, 3000, 4000, 1000}});
  auto const drawn = counted.resample(1000, {.scheme = sy::scheme::multinomial});
  auto const e = drawn.as_sample().expectation(itself);
  double const parent = counted.expectation(itself).standard_error;
  double const variance = parent * parent * 10'000.0;
  CHECK(e.standard_error == doctest::Approx(std::sqrt(parent * parent + variance / 1000.0)).epsilon(0.1));
}

TEST_CASE("resampling: refusals") {
  auto const sample = sy::weigh(std::vector<double>{1.0, 2.0}, flat);
  for (sy::scheme const how :
       {sy::scheme::stratified, sy::scheme::residual, sy::scheme::priority, sy::scheme::successive})
    CHECK(law::holds(law::said<sy::bad_argument>([&] { sample.resample(0, {.scheme = how}); }),
                     "0 states were asked for"));
  CHECK(law::holds(law::said<sy::not_kept>([&] { sample.resample(2).as_sample().states(); }), "states"));
}
