// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <string>
#include <vector>

#include "statistics/questions.hpp"

// Standard errors from both sides: over 4000 seeds the mean of z^2, z = (answer - exact) / standard error, is 1 within 0.1, or
// what Student's t or the few states under an error bar make of it.

namespace {

using namespace known;

constexpr std::uint64_t seeds = 4'000;

double by_student(double degrees) { return degrees / (degrees - 2.0); }

}  // namespace

TEST_CASE("mean z^2 of every estimator but the quantiles is near 1") {
  std::vector<std::string> names{"wide normal", "prior weights", "lognormal", "whole numbers, counted", "200 groups"};
  if (honest()) names.insert(names.end(), {"rare event in a narrow posterior", "rounded reading", "window", "failed runs"});
  for (std::string const& name : names) {
    problem const& p = of(name);
    std::size_t const size = honest() ? 10'000 : 2'000;
    std::vector<cell> const cells = ask_often(seeds, [&](std::uint64_t seed) { return ask_all(p.from.sample(seed, size), p); });
    for (std::size_t q = 0; q < cells.size(); ++q) {
      std::string const question = questions[q];
      if (is_quantile(question)) continue;
      // Copies that lie side by side are not independent: the runs of 16 that the jackknife deletes differ too much or too little.
      if (p.name == "whole numbers, counted" && question == "own estimator") continue;
      // 64 groups of the jackknife have 63 degrees of freedom; the others have many carriers.
      double const want = question == "own estimator" ? by_student(63) : 1.0;
      double const got = cells[q].mean_z2();
      std::printf("%-36s %6zu  %-20s mean z^2 %.3f, expected %.3f\n", name.c_str(), size, question.c_str(), got, want);
      INFO(name, ", ", question);
      CHECK(std::abs(got - want) < 0.1);
    }
  }
}

TEST_CASE("mean z^2 of quantiles is near 1, but for the few states that a standard error spans") {
  // Half the width of the 68.27 % limits is a sum of m spacings between neighbours, nearly exponential: s is Gamma(m)/m, and
  // the mean of 1/s^2 is m^2/((m-1)(m-2)).
  struct {
    char const* name;
    std::size_t size;
  } const asked_of[] = {{"uniform, no reading", 10'000}, {"wide normal", 2'000}, {"prior weights", 2'000}};
  constexpr std::array orders{0.5, 0.75, 0.9};
  for (auto const& each : asked_of) {
    char const* const name = each.name;
    std::size_t const size = each.size;
    problem const& p = of(name);
    for (double const order : orders) {
      double const exact = p.exact.quantile(order);
      std::vector<double> spanned(seeds), z2(seeds);
      sy::on_threads(0)(seeds, [&](std::size_t t) {
        auto const sample = p.from.sample(t + 1, size);
        sy::quantile_result const q = sample.quantile(&point::x, order);
        sy::interval const one = q.error_interval(sy::quantile_result::one_sigma);
        for (double const x : sample.values(&point::x)) spanned[t] += x > one.lower && x <= one.upper ? 1.0 : 0.0;
        z2[t] = std::pow((q.value - exact) / q.standard_error, 2);
      });
      double mean_z2 = 0.0, m = 0.0;
      for (std::size_t t = 0; t < seeds; ++t) {
        mean_z2 += z2[t] / seeds;
        m += spanned[t] / seeds;
      }
      double const want = m * m / ((m - 1.0) * (m - 2.0));
      std::printf("%-36s %6zu  quantile %.2f         mean z^2 %.3f, expected %.3f from %.0f states\n", name, size, order, mean_z2,
                  want, m);
      INFO(name, ", ", order);
      CHECK(std::abs(mean_z2 - want) < 0.1);
      if (size == 10'000) CHECK(std::abs(mean_z2 - 1.0) < 0.1);
    }
  }
}

TEST_CASE("few groups: z is Student's t where group sums are normal") {
  problem const& p = of("16 groups, no reading");
  std::vector<cell> const cells = ask_often(seeds, [&](std::uint64_t seed) { return ask_all(p.from.sample(seed, 320), p); });
  double const got = cells[0].mean_z2(), want = by_student(15);
  std::printf("%-36s %6d  %-20s mean z^2 %.3f, expected %.3f\n", p.name.c_str(), 320, "mean", got, want);
  CHECK(std::abs(got - want) < 0.1);
  for (std::size_t l = 0; l < levels.size(); ++l) {
    hit_limits const exact(seeds, levels[l], levels[l]);
    INFO("level ", levels[l]);
    CHECK(cells[0].hits[l] >= exact.least);
    CHECK(cells[0].hits[l] <= exact.most);
  }
}

TEST_CASE("reported and observed variance meet the exact ones of a normal prior under a normal reading") {
  // Owen, Monte Carlo theory, methods and examples, 2013, ch. 9: variance and bias of the self-normalised mean, by integrals over
  // prior N(0, 1) times the squared likelihood; computed to 15 digits from the closed form.
  struct {
    double reading, sd, mean, of_mean, of_share;  // n times the variance of the mean and of P(x > mean)
    std::size_t size;
  } const rows[] = {{0, 1, 0, 0.384900179459751, 0.288675134594813, 2'000},
                    {1, 1, 0.5, 0.492597987828518, 0.341029376188974, 2'000},
                    {3, 0.5, 2.4, 7.45062028208506, 10.2218875821289, 20'000}};
  for (auto const& row : rows) {
    sy::pipeline const pipe{normal_prior(0, 1), normal_reading(row.reading, row.sd)};
    std::vector<std::array<double, 4>> each(seeds);
    sy::on_threads(0)(seeds, [&](std::size_t t) {
      auto const answers = pipe.estimate({.size = row.size, .seed = t + 1}, sy::expectation(&point::x),
                                         sy::probability([m = row.mean](point const& s) { return s.x > m; }));
      auto const& [mean, share] = answers;
      each[t] = {mean.value, std::pow(mean.standard_error, 2), share.value, std::pow(share.standard_error, 2)};
    });
    double const n = static_cast<double>(row.size);
    std::array<double, 4> average{}, spread_of{};
    for (auto const& one : each)
      for (std::size_t k = 0; k < 4; ++k) average[k] += one[k] / seeds;
    for (auto const& one : each)
      for (std::size_t k = 0; k < 4; ++k) spread_of[k] += std::pow(one[k] - average[k], 2) / (seeds - 1);
    std::printf("reading %g, sd %g: n var(mean) %.4f exact, %.4f observed, %.4f reported; of P(x > mean) %.4f, %.4f, %.4f\n",
                row.reading, row.sd, row.of_mean, n * spread_of[0], n * average[1], row.of_share, n * spread_of[2],
                n * average[3]);
    INFO("reading ", row.reading);
    CHECK(n * spread_of[0] == doctest::Approx(row.of_mean).epsilon(0.1));
    CHECK(n * average[1] == doctest::Approx(row.of_mean).epsilon(0.03));
    CHECK(n * spread_of[2] == doctest::Approx(row.of_share).epsilon(0.1));
    CHECK(n * average[3] == doctest::Approx(row.of_share).epsilon(0.03));
  }
}

TEST_CASE("the bias of a ratio is as small as it must be") {
  // Owen 2013, ch. 9: bias of the mean about -E[w^2 (f - mu)]/(n (E w)^2); -0.227352917459316/n for a reading of 1 with sd 1,
  // 0 for a reading of 0. 2e5 repeats of n = 100.
  constexpr std::size_t repeats = 200'000, n = 100;
  struct {
    double reading, mean, bias, variance;
  } const rows[] = {{0, 0, 0, 0.384900179459751}, {1, 0.5, -0.227352917459316, 0.492597987828518}};
  for (auto const& row : rows) {
    sy::pipeline const pipe{normal_prior(0, 1), normal_reading(row.reading, 1)};
    std::vector<double> sums((repeats + 999) / 1'000);
    sy::on_threads(0)(sums.size(), [&](std::size_t t) {
      for (std::size_t seed = 1'000 * t + 1; seed <= 1'000 * (t + 1); ++seed)
        sums[t] += pipe.expectation({.size = n, .seed = seed}, &point::x).value - row.mean;
    });
    double bias = 0.0;
    for (double const sum : sums) bias += sum / static_cast<double>(repeats);
    double const one = std::sqrt(row.variance / static_cast<double>(n * repeats));
    std::printf("reading %g: bias %.6f, expected %.6f, standard error %.6f\n", row.reading, bias, row.bias / n, one);
    // the next term of the expansion is of order 1/n of the first
    CHECK(std::abs(bias - row.bias / n) < 4.0 * one + 3.0 * std::abs(row.bias) / (n * n));
  }
}
