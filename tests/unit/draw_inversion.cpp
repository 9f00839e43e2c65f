// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/inversion.hpp>

#include <boost/math/distributions/normal.hpp>

#include <bit>
#include <cmath>
#include <cstdint>
#include <vector>

// Reference: Boost.Math in long double.

namespace sy = steelyard;
using sy::detail::exponential_from_word;
using sy::detail::normal_from_word;

namespace {

double relative(double got, long double want) {
  return static_cast<double>(std::abs((static_cast<long double>(got) - want) / want));
}

// Words all over: spread evenly, and towards both ends in powers of two.
std::vector<std::uint64_t> some_words() {
  std::vector<std::uint64_t> words;
  for (int k = 0; k < 64; ++k)
    for (std::uint64_t const m : {8u, 9u, 11u, 13u, 15u}) {
      std::uint64_t const word = k >= 3 ? m << (k - 3) : m >> (3 - k);
      words.push_back(word);
      words.push_back(~word);
    }
  for (std::uint64_t k = 0; k < 500; ++k) words.push_back(k * 0x9E3779B97F4A7C15u);
  words.push_back(0);
  words.push_back(~std::uint64_t{0});
  return words;
}

// The probability of a word's tail, with all its 64 bits and the half.
long double tail_of(std::uint64_t word) {
  return (static_cast<long double>(word) + 0.5L) * 0x1p-64L;  // a long double here holds 64 bits
}

}  // namespace

TEST_CASE("normal deviates agree with Boost.Math to 1e-15 in both tails") {
  boost::math::normal_distribution<long double> const normal;
  double worst = 0.0;
  for (std::uint64_t const word : some_words()) {
    bool const lower = word < (std::uint64_t{1} << 63);
    long double const p = tail_of(lower ? word : ~word);
    long double z = quantile(normal, p);
    if (p > 0.4999L) {  // 1/2 - p is exact; near zero the quantile is that distance times sqrt(2 pi), to third order
      std::uint64_t const distance = (std::uint64_t{1} << 63) - 1 - (lower ? word : ~word);
      long double const q = tail_of(distance);
      long double const slope = 2.506628274631000502415765284811L;
      z = -slope * q * (1.0L + slope * slope * q * q / 6.0L);
    }
    double const error = relative(normal_from_word(word), lower ? z : -z);
    if (error > worst) worst = error;
    CHECK_MESSAGE(error < 1e-15, "word ", word);
  }
  MESSAGE("normal_from_word: worst relative error ", worst);
}

TEST_CASE("near the middle normal deviates keep their digits and mirror each other") {
  std::uint64_t const middle = std::uint64_t{1} << 63;
  double const slope = 2.5066282746310002;  // sqrt(2 pi)
  CHECK(normal_from_word(middle) == doctest::Approx(slope * 0x1p-65).epsilon(1e-15));
  CHECK(normal_from_word(middle + 3) == doctest::Approx(slope * 7 * 0x1p-65).epsilon(1e-15));
  for (std::uint64_t const word : some_words()) CHECK(normal_from_word(~word) == -normal_from_word(word));
}

TEST_CASE("word_from_normal is the inverse") {
  for (std::uint64_t const word : some_words()) {
    double const z = normal_from_word(word);
    double const back = normal_from_word(sy::detail::word_from_normal(z));
    CHECK(std::abs(back - z) < 1e-15 + 1e-14 * std::abs(z) + (std::abs(z) > 6.0 ? 1e-3 : 0.0));
  }
  CHECK(sy::detail::word_from_normal(-50.0) == 0);
  CHECK(sy::detail::word_from_normal(50.0) == ~std::uint64_t{0});
  CHECK(sy::detail::word_from_normal(0.0) == std::uint64_t{1} << 63);
  CHECK((std::uint64_t{1} << 63) - sy::detail::word_from_normal(-0x1p-80) <= 2048);
}

TEST_CASE("the far tail is resolved: P(Z > 8)") {
  // 6.2209605742717841e-16 by 40-digit quadrature: 11475.6 of 2^64 words
  std::uint64_t beyond = 0;
  while (normal_from_word(~beyond) > 8.0) ++beyond;
  CHECK(beyond == 11476);
  beyond = 0;
  while (normal_from_word(beyond) < -8.0) ++beyond;
  CHECK(beyond == 11476);
  CHECK(normal_from_word(0) < -9.1);
  CHECK(normal_from_word(~std::uint64_t{0}) > 9.1);
}

TEST_CASE("exponential deviates agree with the logarithm in long double to 1e-15") {
  double worst = 0.0;
  for (std::uint64_t const word : some_words()) {
    bool const lower = word < (std::uint64_t{1} << 63);
    long double const p = tail_of(lower ? word : ~word);
    long double const want = lower ? -std::log1p(-p) : -std::log(p);
    double const error = relative(exponential_from_word(word), want);
    if (error > worst) worst = error;
    CHECK_MESSAGE(error < 1e-15, "word ", word);
  }
  MESSAGE("exponential_from_word: worst relative error ", worst);
}

TEST_CASE("deviates rise with the word") {
  // strictly over steps of 2^-12 of the tail; neighbouring words may round to one another's value, within 4 ulp
  for (auto const from_word : {&normal_from_word, &exponential_from_word})
    for (std::uint64_t const word : some_words()) {
      bool const lower = word < (std::uint64_t{1} << 63);
      std::uint64_t const tail = lower ? word : ~word;
      std::uint64_t const step = (tail >> 12) + 1;
      if (lower) {
        CHECK(from_word(word) < from_word(word + step));
      } else {
        CHECK(from_word(word - step) < from_word(word));
      }
      if (word != ~std::uint64_t{0}) {
        double const here = from_word(word);
        CHECK(from_word(word + 1) >= here - 4.0 * std::abs(here) * 0x1p-53);
      }
    }
}

TEST_CASE("deviates are distributed as they should be") {
  // probability integral transform, 20 even cells, 8000 draws; 99.99 % point of chi-square at 19 degrees: 50.795
  std::vector<int> normal(20);
  std::vector<int> exponential(20);
  std::vector<int> uniform(20);
  boost::math::normal_distribution<double> const standard;
  sy::draws d(1);
  for (int k = 0; k < 8000; ++k) {
    ++normal[static_cast<std::size_t>(20.0 * cdf(standard, d.normal()))];
    ++exponential[static_cast<std::size_t>(-20.0 * std::expm1(-2.5 * d.exponential(2.5)))];
    ++uniform[static_cast<std::size_t>(20.0 * d.uniform())];
  }
  for (auto const* cells : {&normal, &exponential, &uniform}) {
    double chi_square = 0.0;
    for (int const n : *cells) chi_square += (n - 400.0) * (n - 400.0) / 400.0;
    CHECK(chi_square < 50.795);
  }
}

TEST_CASE("deviates have the same bits in every build") {
  // No outside source: made by g++ 12 -O0 and met by every compiler and flag since, -ffast-math and
  // -march=native included. A contracted or reordered operation anywhere would change them.
  std::uint64_t hash = 0;
  auto const mix = [&hash](double x) { hash = (hash ^ std::bit_cast<std::uint64_t>(x)) * 0x9E3779B97F4A7C15u; };
  for (std::uint64_t const word : some_words()) {
    mix(normal_from_word(word));
    mix(exponential_from_word(word));
    mix(sy::detail::uniform_from_word(word));
    mix(sy::detail::portable_exp(-static_cast<double>(word >> 12) * 0x1p-45));
  }
  CHECK(hash == 16079497985415963584u);
}
