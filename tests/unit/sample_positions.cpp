// SPDX-License-Identifier: BSL-1.0
// Where draws fall among weights, against sums in whole numbers of any length.

#include <doctest/doctest.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>
#include <vector>

#if defined(__GNUC__) && !defined(__clang__)
#pragma GCC diagnostic ignored "-Wmaybe-uninitialized"  // seen in cpp_int by GCC 12
#endif
#include <boost/multiprecision/cpp_int.hpp>

#include <steelyard/core.hpp>

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

using big = boost::multiprecision::cpp_int;

std::vector<double> weights_of(std::size_t n, std::uint64_t seed) {
  sy::draws source(seed);
  std::vector<double> w(n);
  for (double& each : w) each = source.chance(0.2) ? 0.0 : std::exp(4.0 * source.normal());
  return w;
}

/// Weight in units of 2^-200: exact for what the tests use.
big exact(double w) {
  int power = 0;
  double const m = std::frexp(w, &power);
  return big(static_cast<std::int64_t>(std::ldexp(m, 53))) << (power - 53 + 200);
}

}  // namespace

TEST_CASE("positions: systematic draws are those of exact arithmetic") {
  for (std::size_t const n : {1u, 2u, 3u, 7u, 100u, 5'000u})
    for (std::size_t const k : {1u, 2u, 3u, 4u, 5u, 99u, 5'000u, 20'000u}) {
      CAPTURE(n);
      CAPTURE(k);
      std::vector<double> w = weights_of(n, n + k);
      w[n / 2] = 1.0;
      big total = 0;
      for (double const each : w) total += exact(each);
      double const u = sy::draws(5, n * k).uniform();
      auto const drawn = detail::systematic_positions(w, k, u);
      REQUIRE(drawn.size() == k);
      big const start = static_cast<std::int64_t>(u * 0x1p53);
      big sum = exact(w[0]);
      std::size_t i = 0, differ = 0;
      for (std::size_t j = 0; j < k; ++j) {
        big const at = total * ((big(j) << 53) + start) / (big(k) << 53);
        while (i + 1 < n && sum <= at) sum += exact(w[++i]);
        if (drawn[j] != i) ++differ;
      }
      CHECK(differ == 0);  // a draw within 2^-40 of an end may fall on either side: none does here
    }
}

TEST_CASE("positions: a million equal weights are drawn once each, whatever the start") {
  for (double const unit : {0.1, 1.0, 1e-300, 1e250}) {
    std::vector<double> const w(1'000'000, unit);
    for (double const u : {0x1p-20, 0.5, 1.0 - 0x1p-20}) {
      auto const drawn = detail::systematic_positions(w, w.size(), u);
      std::size_t elsewhere = 0;
      for (std::size_t j = 0; j < drawn.size(); ++j) elsewhere += drawn[j] == j ? 0u : 1u;
      CHECK(elsewhere == 0);
    }
  }
}

TEST_CASE("positions: points in rising order fall where bisection of the running sums puts them") {
  constexpr std::uint64_t whole = std::uint64_t{1} << 62;
  for (std::size_t const n : {1u, 2u, 255u, 256u, 257u, 3'000u})
    for (std::size_t const k : {1u, 2u, 3u, 4u, 5u, 6u, 7u, 1'000u, 10'000u}) {
      CAPTURE(n);
      CAPTURE(k);
      std::vector<double> w = weights_of(n, 3 * n + k);
      w[n - 1 - n / 3] = 2.0;
      detail::whole_shares const shares(w, whole);
      std::vector<std::uint64_t> ends;
      std::uint64_t sum = 0;
      for (double const each : w) ends.push_back(sum += shares(each));
      CHECK(std::abs(static_cast<double>(sum) - 0x1p62) < 0x1p20);
      sy::draws source(9, n + k);
      std::vector<std::uint64_t> points(k);
      for (std::uint64_t& each : points) each = source.index(whole);
      if (k > 3) points[1] = points[2];
      std::sort(points.begin(), points.end());
      std::vector<std::size_t> places(points.begin(), points.end());
      detail::points_to_positions(w, whole, places);
      std::size_t differ = 0;
      for (std::size_t j = 0; j < k; ++j) {
        auto const at = static_cast<std::size_t>(std::upper_bound(ends.begin(), ends.end(), points[j]) - ends.begin());
        if (places[j] != std::min(at, detail::last_position(w))) ++differ;
      }
      CHECK(differ == 0);
    }
}

TEST_CASE("positions: weights of zero are never drawn, at either end or between") {
  std::vector<double> const w{0.0, 0.0, 3.0, 0.0, 1.0, 0.0, 0.0};
  for (sy::scheme const how : {sy::scheme::systematic, sy::scheme::multinomial, sy::scheme::stratified, sy::scheme::residual})
    for (std::uint64_t r = 0; r < 200; ++r) {
      sy::draws source(4, r);
      for (std::size_t const i : detail::draw_slots(how, w, 1 + r % 9, source).positions) CHECK((i == 2 || i == 4));
    }
}

TEST_CASE("positions: the smallest weights a double holds are drawn in proportion too") {
#if defined(__FAST_MATH__)
  double const tiny = 0x1p-1022;  // a program linked with -ffast-math tells the processor to take less than this for zero
#else
  double const tiny = 0x1p-1070;
#endif
  std::vector<double> const w{tiny, 3 * tiny};
  CHECK(detail::systematic_positions(w, 4, 0.5) == std::vector<std::size_t>{0, 1, 1, 1});
}
