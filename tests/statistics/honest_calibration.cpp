// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>
#include <steelyard/proof/calibration.hpp>
#include <steelyard/proof/coverage.hpp>

#include <boost/math/distributions/binomial.hpp>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <string>
#include <vector>

#include "statistics/cells.hpp"
#include "statistics/sources.hpp"

// The test kit's own claims: that it is exact at every size where ranks of resampled draws are not, that it raises no
// false alarm more often than stated, and what it sees.

namespace {

namespace sy = steelyard;
namespace proof = steelyard::proof;

auto const prior = [](sy::draws& d) { return d.normal(); };
auto const fake = [](double truth, sy::draws& d) { return truth + 0.5 * d.normal(); };
auto weighed(double sd, double shift = 0.0) {
  return [=](double y) {
    return [=](double x) { return sy::log_likelihood{-0.5 * std::pow((y - shift - x) / sd, 2)}; };
  };
}
auto const itself = [](double x) { return x; };

/// Ranks of the truth among 19 draws resampled from `size` weighted ones, over many truths: chi-square on 20 values.
double chi_square_of_ranks(std::uint64_t repeats, std::size_t size) {
  std::vector<double> places(repeats);
  sy::on_threads(0)(places.size(), [&](std::size_t r) {
    sy::draws of_truth(1, r, sy::purpose::calibration, 0), of_reading(1, r, sy::purpose::calibration, 1);
    double const truth = prior(of_truth), y = fake(truth, of_reading);
    sy::pipeline const pipe{prior, weighed(0.5)(y)};
    auto const some =
        pipe.run({.size = size, .seed = r + 1}).resample(19, {.seed = r + 1, .scheme = sy::scheme::multinomial});
    double below = 0.0;
    for (double const x : some) below += x < truth ? 1.0 : 0.0;
    places[r] = (below + 0.5) / 20.0;
  });
  return proof::test_uniform(places, 20, 1e-4).chi_square;
}

}  // namespace

TEST_CASE("ranks of resampled draws are biased at a small size; the truth in its pool is not") {
  // Rank of the truth among L independent posterior draws is uniform on 0..L [Talts et al. 2018, arXiv 1804.06788];
  // draws resampled from n weighted ones are not quite from the posterior. The 99.99 % limit of chi-square is 50.795490
  // on 19 degrees of freedom.
  std::uint64_t const repeats = known::honest() ? 100'000 : 20'000;
  double const small = chi_square_of_ranks(repeats, 100);
  double const large = chi_square_of_ranks(repeats / 10, 2'000);
  std::printf(
      "ranks: chi-square on 19 degrees %.1f (100 draws, %llu truths), %.1f (2000 draws, %llu truths)\n",
      small, static_cast<unsigned long long>(repeats), large, static_cast<unsigned long long>(repeats / 10));
  CHECK(small > 50.79549);
  CHECK(large < 50.79549);
  for (unsigned const size : {1u, 5u, 20u, 100u}) {
    auto const exact = proof::calibration(prior, fake, weighed(0.5), itself,
                                          {.repeats = repeats, .size = size, .executor = sy::on_threads(0)});
    std::printf("in the pool of %u draws: chi-square %.1f from %llu truths\n", size, exact.numbers().chi_square,
                static_cast<unsigned long long>(repeats));
    INFO(exact.sentence());
    CHECK(exact);
  }
}

TEST_CASE("calibration raises a false alarm no more often than stated, at any size") {
  std::uint64_t const trials = known::honest() ? 4'000 : 1'000;
  constexpr double rate = 0.05;
  for (unsigned const size : {2u, 20u}) {
    std::vector<char> alarm(trials);
    sy::on_threads(0)(alarm.size(), [&](std::size_t t) {
      alarm[t] = proof::calibration(prior, fake, weighed(0.5), itself,
                                    {.repeats = 200, .size = size, .seed = t + 1, .false_alarm = rate, .bins = 10})
                     ? 0
                     : 1;
    });
    std::uint64_t alarms = 0;
    for (char const each : alarm) alarms += static_cast<std::uint64_t>(each);
    std::printf("calibration with %u draws: %llu false alarms in %llu trials at a rate of %.2f\n", size,
                static_cast<unsigned long long>(alarms), static_cast<unsigned long long>(trials), rate);
    CHECK(alarms <= proof::detail::hit_limits(trials, rate, 1e-4).second);
    CHECK(alarms >=
          proof::detail::hit_limits(trials, 0.5 * rate, 1e-4).first);  // each of its two tests has half the rate
  }
}

TEST_CASE("what calibration sees: one line a fault") {
  struct {
    char const* name;
    double sd, shift;
  } const faults[] = {{"none", 0.5, 0.0},          {"10 % too narrow", 0.45, 0.0}, {"20 % too narrow", 0.4, 0.0},
                      {"20 % too wide", 0.6, 0.0}, {"40 % too wide", 0.7, 0.0},    {"shifted by 0.1", 0.5, 0.1},
                      {"shifted by 0.2", 0.5, 0.2}};
  std::uint64_t const trials = known::honest() ? 400 : 40;
  std::printf("%-18s found by 1000 truths with 200 draws each, false-alarm rate 1e-4\n", "fault");
  double last = 0.0;
  for (auto const& fault : faults) {
    std::vector<char> found(trials);
    sy::on_threads(0)(found.size(), [&](std::size_t t) {
      found[t] = proof::calibration(prior, fake, weighed(fault.sd, fault.shift), itself, {.seed = t + 1}) ? 0 : 1;
    });
    double share = 0.0;
    for (char const each : found) share += static_cast<double>(each) / static_cast<double>(trials);
    std::printf("%-18s %5.1f %%\n", fault.name, 100.0 * share);
    std::string const name = fault.name;
    if (name == "none") CHECK(share < 0.03);
    if (name == "20 % too narrow" || name == "40 % too wide" || name == "shifted by 0.2") CHECK(share > 0.9);
    last = share;
  }
  CHECK(last > 0.0);
}

TEST_CASE("4000 repeats catch a true coverage of 93 % nine times in ten") {
  // By the binomial law itself: outside 3744 to 3851, probability 0.93.
  boost::math::binomial const hits(4'000.0, 0.93);
  double const power = cdf(hits, 3'743.0) + cdf(complement(hits, 3'851.0));
  CHECK(power == doctest::Approx(0.93).epsilon(0.01));
  // and by the check
  std::uint64_t const trials = known::honest() ? 1'000 : 200;
  std::vector<char> caught(trials);
  sy::on_threads(0)(caught.size(), [&](std::size_t t) {
    caught[t] = proof::coverage(
                    [&](std::uint64_t seed) {
                      sy::draws d(seed, t);
                      double const x = d.normal();
                      return sy::interval{x - 1.8119106729525978, x + 1.8119106729525978, true, true};  // covers 93 %
                    },
                    0.0, {.repeats = 4'000})
                    ? 0
                    : 1;
  });
  std::uint64_t count = 0;
  for (char const each : caught) count += static_cast<std::uint64_t>(each);
  std::printf("a true 93 %% is caught in %llu of %llu trials, expected %.3f\n", static_cast<unsigned long long>(count),
              static_cast<unsigned long long>(trials), power);
  auto const limits = proof::detail::hit_limits(trials, power, 1e-4);
  CHECK(count >= limits.first);
  CHECK(count <= limits.second);
}

TEST_CASE("intervals of 1.96 standard errors cover less where few degrees of freedom are behind them") {
  // Student's t, 2 F(1.96) - 1: 10: 0.92156, 20: 0.93592, 50: 0.94441; the library's own quantiles must say the same.
  for (auto const& [degrees, covered] : {std::pair{10.0, 0.92156}, {20.0, 0.93592}, {50.0, 0.94441}})
    CHECK(sy::detail::student_upper_quantile(0.5 * (1.0 - covered), degrees) ==
          doctest::Approx(1.959964).epsilon(1e-4));
}
