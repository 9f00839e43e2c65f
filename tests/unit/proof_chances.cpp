// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/uniformity.hpp>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <tuple>
#include <utility>
#include <vector>

namespace sy = steelyard;
namespace kit = steelyard::proof::detail;

TEST_CASE("limits for the hits of a true 95 % interval, false alarm 1e-4") {
  // Exact binomial tails, half of 1e-4 on either side; computed from the binomial distribution in exact arithmetic.
  struct {
    std::uint64_t repeats, least, most;
  } const rows[] = {{200, 176, 199}, {1'000, 921, 975}, {2'000, 1'860, 1'936}, {4'000, 3'744, 3'851}};
  for (auto const& row : rows) {
    auto const [least, most] = kit::hit_limits(row.repeats, 0.95, 1e-4);
    CHECK(least == row.least);
    CHECK(most == row.most);
  }
  CHECK(kit::hit_limits(2, 0.95, 1e-4).first == 0u);
  CHECK(kit::hit_limits(100, 0.95, 1e-4).second == 100u);
}

TEST_CASE("limits for hits are the tightest that keep the rate, by the sum of the probabilities themselves") {
  for (auto const& [n, p, rate] :
       {std::tuple{60, 0.95, 1e-4}, std::tuple{25, 0.3, 0.05}, std::tuple{400, 0.01, 1e-3}}) {
    std::vector<double> chance;
    for (int k = 0; k <= n; ++k)
      chance.push_back(std::exp(std::lgamma(n + 1.0) - std::lgamma(k + 1.0) - std::lgamma(n - k + 1.0) +
                                k * std::log(p) + (n - k) * std::log1p(-p)));
    double below = 0.0, above = 0.0;
    std::uint64_t least = 0, most = static_cast<std::uint64_t>(n);
    while (below + chance[least] <= 0.5 * rate) below += chance[least++];
    while (above + chance[most] <= 0.5 * rate) above += chance[most--];
    auto const got = kit::hit_limits(static_cast<std::uint64_t>(n), p, rate);
    CHECK(got.first == least);
    CHECK(got.second == most);
  }
}

TEST_CASE("chi-square at its 99.99 % points") {
  // Standard tables carried to eight digits: the upper 1e-4 point for 9, 19, 49 and 99 degrees of freedom.
  for (auto const& [degrees, point] :
       {std::pair{9.0, 33.719948}, {19.0, 50.795490}, {49.0, 94.596722}, {99.0, 160.055738}})
    CHECK(kit::chi_square_upper(point, degrees) == doctest::Approx(1e-4).epsilon(1e-6));
  CHECK(kit::chi_square_upper(0.0, 9.0) == 1.0);
}

TEST_CASE("the chance to leave an envelope is exact: by hand, and against simulation") {
  // Two numbers, one point at 1/2, counts allowed: exactly one. Leaving: both on one side, 1/2.
  kit::envelope one;
  one.lower = {1};
  one.upper = {1};
  CHECK(kit::leaving_probability(2, 2, one) == doctest::Approx(0.5).epsilon(1e-14));
  // Three numbers, points 1/3 and 2/3, counts (1, 2): one in each third, 3!/27.
  kit::envelope two;
  two.lower = {1, 2};
  two.upper = {1, 2};
  CHECK(kit::leaving_probability(3, 3, two) == doctest::Approx(1.0 - 6.0 / 27.0).epsilon(1e-14));

  constexpr std::uint64_t n = 200, points = 20;
  kit::envelope const wide = kit::exact_envelope(n, points, 0.1);
  double const exact = kit::leaving_probability(n, points, wide);
  CHECK(exact <= 0.1);
  CHECK(exact > 0.05);  // counts are whole: the rate is met in steps
  constexpr std::uint64_t trials = 4'000;
  std::uint64_t left = 0;
  for (std::uint64_t t = 0; t < trials; ++t) {
    sy::draws source(1, t);
    std::vector<std::uint64_t> counts(points);
    for (std::uint64_t i = 0; i < n; ++i)
      ++counts[static_cast<std::size_t>(source.uniform() * static_cast<double>(points))];
    std::uint64_t sum = 0;
    bool out = false;
    for (std::size_t k = 0; k + 1 < points; ++k) {
      sum += counts[k];
      out = out || sum < wide.lower[k] || sum > wide.upper[k];
    }
    left += out ? 1u : 0u;
  }
  auto const limits = kit::hit_limits(trials, exact, 1e-6);
  CHECK(left >= limits.first);
  CHECK(left <= limits.second);
}

TEST_CASE("the direction of a failure") {
  std::vector<double> even, narrow, wide, low, twice;
  for (int i = 0; i < 1'000; ++i) {
    double const u = (i + 0.5) / 1'000.0;
    even.push_back(u);
    narrow.push_back(0.5 + 0.5 * (u < 0.5 ? -1.0 : 1.0) * std::pow(std::abs(2.0 * u - 1.0), 0.5));
    wide.push_back(0.5 + 0.3 * (2.0 * u - 1.0));
    low.push_back(u * u);
    twice.push_back(std::fmod(20.0 * u, 1.0) < 0.5 ? std::floor(20.0 * u) / 20.0 + 0.01
                                                   : std::floor(20.0 * u) / 20.0 + 0.02);
  }
  auto const words = [](std::vector<double> const& x) { return sy::proof::test_uniform(x, 20, 1e-4).direction; };
  CHECK(words(narrow).find("too narrow") == 0u);
  CHECK(words(wide).find("too wide") == 0u);
  CHECK(words(low).find("shifted: it lies above") == 0u);
  CHECK(words(twice).find("neither") == 0u);
  sy::proof::uniformity const u = sy::proof::test_uniform(even, 20, 1e-4);
  CHECK(u.chi_square == doctest::Approx(0.0));
  CHECK_FALSE(u.left_envelope);
  CHECK(u.mean == doctest::Approx(0.5));
  CHECK(u.spread == doctest::Approx(1.0).epsilon(1e-5));
  CHECK(sy::proof::test_uniform(low, 20, 1e-4).left_envelope);
}

TEST_CASE("uniform numbers are called uneven at the stated rate") {
  // The two tests have half the rate each; they overlap, so that the rate in all lies between a half and the whole of it.
  constexpr std::uint64_t trials = 3'000;
  constexpr double rate = 0.1;
  std::uint64_t alarms = 0;
  for (std::uint64_t t = 0; t < trials; ++t) {
    sy::draws source(2, t);
    std::vector<double> x;
    for (int i = 0; i < 200; ++i) x.push_back(source.uniform());
    sy::proof::uniformity const u = sy::proof::test_uniform(x, 10, rate);
    alarms += u.chi_square_chance < 0.5 * rate || u.left_envelope ? 1u : 0u;
  }
  CHECK(alarms >= kit::hit_limits(trials, 0.5 * rate, 1e-6).first);
  CHECK(alarms <= kit::hit_limits(trials, rate, 1e-6).second);
}
