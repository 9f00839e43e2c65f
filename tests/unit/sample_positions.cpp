// SPDX-License-Identifier: BSL-1.0
// Where draws fall among weights, against sums in whole numbers of any length.

#include <doctest/doctest.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
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

/// The widths that this processor runs.
std::vector<detail::isa> widths() {
  std::vector<detail::isa> all;
  for (detail::isa const width : {detail::isa::plain, detail::isa::sse2, detail::isa::avx2, detail::isa::avx512})
    if (width <= detail::widest_isa()) all.push_back(width);
  return all;
}

/// Where systematic draws fall, by one whole sum after another.
std::vector<std::size_t> systematic_one_by_one(std::vector<double> const& w, std::size_t k, double u) {
  int const bits = detail::share_bits(k);
  std::uint64_t const one = std::uint64_t{1} << bits;
  detail::whole_shares const shares(w, k * one);
  std::uint64_t sum = one - 1 - static_cast<std::uint64_t>(u * static_cast<double>(one));
  std::vector<std::size_t> drawn;
  for (std::size_t i = 0; i < detail::last_position(w); ++i) {
    sum += shares(w[i]);
    while (drawn.size() < std::min<std::uint64_t>(sum >> bits, k)) drawn.push_back(i);
  }
  drawn.resize(k, detail::last_position(w));
  return drawn;
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
      for (detail::isa const width : widths()) {
        std::vector<std::size_t> places(points.begin(), points.end());
        detail::points_to_positions(w, whole, places, width);
        std::size_t differ = 0;
        for (std::size_t j = 0; j < k; ++j) {
          auto const at = static_cast<std::size_t>(std::upper_bound(ends.begin(), ends.end(), points[j]) - ends.begin());
          if (places[j] != std::min(at, detail::last_position(w))) ++differ;
        }
        CHECK(differ == 0);
      }
    }
}

TEST_CASE("positions: points crowded between two weights, or none among thousands, fall where bisection puts them") {
  constexpr std::uint64_t whole = std::uint64_t{1} << 62;
  for (std::size_t const n : {10u, 5'000u})
    for (std::uint64_t const spread : {std::uint64_t{1} << 30, std::uint64_t{1} << 52}) {
      std::vector<double> const w(n, 1.0);
      detail::whole_shares const shares(w, whole);
      sy::draws source(10, n);
      std::vector<std::uint64_t> points(3'000);
      for (std::uint64_t& each : points) each = whole / 16 * (1 + 6 * source.index(3)) + source.index(spread);
      std::sort(points.begin(), points.end());
      for (detail::isa const width : widths()) {
        std::vector<std::size_t> places(points.begin(), points.end());
        detail::points_to_positions(w, whole, places, width);
        std::size_t differ = 0;
        for (std::size_t j = 0; j < points.size(); ++j)
          if (places[j] != std::min<std::uint64_t>(points[j] / shares(1.0), n - 1)) ++differ;
        CHECK(differ == 0);
      }
    }
}

TEST_CASE("positions: systematic draws at every width, wherever the array begins, and whatever stands around it") {
  for (std::size_t const n : {1u, 9u, 1'025u, 4'000u})
    for (std::size_t const k : {1u, 7u, 8u, 9u, 2'000u, 4'001u, 100'000u}) {
      CAPTURE(n);
      CAPTURE(k);
      std::vector<double> w = weights_of(n, n + 2 * k);
      w[n / 2] = 1.0;
      double const u = sy::draws(6, n * k).uniform();
      std::vector<std::size_t> const expected = systematic_one_by_one(w, k, u);
      for (detail::isa const width : widths())
        for (std::size_t const start : {1u, 2u, 5u, 8u}) {
          std::vector<std::size_t> all(k + start + 9, 77);
          detail::systematic_positions(w, u, std::span<std::size_t>(all).subspan(start, k), width);
          std::vector<std::size_t> around(all.size(), 77);
          std::copy(expected.begin(), expected.end(), around.begin() + static_cast<std::ptrdiff_t>(start));
          CHECK(all == around);
        }
    }
}

TEST_CASE("positions: millions of systematic draws, which are written around the caches") {
  for (std::size_t const n : {3u, 3'000u, 3'000'000u}) {
    std::vector<double> w = weights_of(n, n);
    w[n / 2] = 1.0;
    std::size_t const k = (std::size_t{1} << 22) + 3;
    std::vector<std::size_t> const expected = systematic_one_by_one(w, k, 0.25);
    for (detail::isa const width : widths()) {
      std::vector<std::size_t> drawn(k + 1);
      detail::systematic_positions(w, 0.25, std::span<std::size_t>(drawn).subspan(1), width);
      CHECK(std::equal(expected.begin(), expected.end(), drawn.begin() + 1));
    }
  }
}

TEST_CASE("positions: multinomial draws are those of sorted uniform numbers, one at a time and at every width") {
  for (std::size_t const k : {1u, 2u, 255u, 256u, 1'023u, 1'024u, 5'000u}) {
    CAPTURE(k);
    std::vector<double> w = weights_of(700, k);
    w[350] = 1.0;
    // Exponential spacings added up in stretches of 256, those pairwise.
    sy::draws one(8, k);
    one();
    std::vector<std::uint64_t> words((k + 8) / 8 * 8, ~std::uint64_t{0});
    for (std::size_t j = 0; j <= k; ++j) words[j] = one();
    std::vector<double> spacings(words.size());
    detail::exponentials_from_words(words, spacings, detail::isa::plain);
    detail::pairwise_sum<double> sums;
    for (std::size_t from = 0; from <= k; from += 256) {
      double sum = 0.0;
      for (std::size_t j = from; j < std::min(from + 256, k + 1); ++j) sum += spacings[j];
      sums.add(sum);
    }
    double const factor = 0x1p62 / sums.total();
    detail::whole_shares const shares(w, std::uint64_t{1} << 62);
    std::vector<std::size_t> expected;
    std::uint64_t point = 0, end = shares(w[0]);
    for (std::size_t j = 0, i = 0; j < k; ++j) {
      point += static_cast<std::uint64_t>(detail::plus(detail::times(spacings[j], factor), 0.5));
      while (end <= point && i < detail::last_position(w)) end += shares(w[++i]);
      expected.push_back(i);
    }
    for (detail::isa const width : widths()) {
      sy::draws source(8, k);
      source();
      std::vector<std::size_t> drawn(k);
      detail::multinomial_positions(w, source, drawn, width);
      CHECK(drawn == expected);
      CHECK(source.words_used() == k + 2);
    }
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
