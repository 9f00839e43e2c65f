// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>

#include <algorithm>
#include <array>
#include <bit>
#include <cmath>
#include <cstdint>
#include <limits>
#include <random>
#include <string>
#include <type_traits>
#include <vector>

namespace sy = steelyard;
using sy::detail::draws_access;

static_assert(std::uniform_random_bit_generator<sy::draws>);
static_assert(std::is_same_v<sy::draws::result_type, std::uint64_t>);
static_assert(sy::draws::min() == 0 && sy::draws::max() == ~std::uint64_t{0});
static_assert(!std::is_copy_constructible_v<sy::draws> && !std::is_copy_assignable_v<sy::draws>);
static_assert(!std::is_move_constructible_v<sy::draws> && !std::is_move_assignable_v<sy::draws>);
static_assert(!std::is_convertible_v<int, sy::draws>);  // a seed is no stream

namespace {

template <class Call>
std::string refusal(Call&& call) {
  try {
    call();
  } catch (sy::bad_argument const& refused) {
    return refused.what();
  }
  return "accepted";
}

std::vector<std::uint64_t> take(sy::draws& d, int n) {
  std::vector<std::uint64_t> words;
  for (int k = 0; k < n; ++k) words.push_back(d());
  return words;
}

std::uint64_t stream_word(std::uint64_t position, std::uint64_t seed, std::uint64_t stream, std::uint64_t what,
                          std::uint64_t round) {
  return sy::detail::philox({position / 4, stream, what, round}, seed, 0)[position % 4];
}

double chi_square(std::vector<int> const& seen, double expected) {
  double sum = 0.0;
  for (int const n : seen) sum += (n - expected) * (n - expected) / expected;
  return sum;
}

}  // namespace

TEST_CASE("words are Philox4x64-10 at (block, stream, purpose, round) under (seed, 0)") {
  // known answer: Random123, see draw_philox.cpp
  sy::draws zero(0, 0);
  CHECK(take(zero, 4) == std::vector<std::uint64_t>{0x16554d9eca36314cu, 0xdb20fe9d672d0fdcu, 0xd7e772cee186176bu,
                                                    0x7e68b68aec7ba23bu});
  sy::draws d(5, 17, sy::purpose::prediction, 3);
  bool same = true;
  for (std::uint64_t k = 0; k < 1000; ++k) {
    CHECK(d.words_used() == k);
    same = same && d() == stream_word(k, 5, 17, 4, 3);
  }
  CHECK(same);
}

TEST_CASE("the numbers of purposes are interface") {
  CHECK(static_cast<int>(sy::purpose::run) == 0);
  CHECK(static_cast<int>(sy::purpose::resample) == 1);
  CHECK(static_cast<int>(sy::purpose::merge) == 2);
  CHECK(static_cast<int>(sy::purpose::move) == 3);
  CHECK(static_cast<int>(sy::purpose::prediction) == 4);
  CHECK(static_cast<int>(sy::purpose::ensemble) == 5);
  CHECK(static_cast<int>(sy::purpose::calibration) == 6);
}

TEST_CASE("one object serves many streams, with or without words made ahead") {
  sy::draws d(1);
  std::vector<std::uint64_t> ahead(8 * 20);
  sy::detail::first_words(9, sy::purpose::run, 0, 100, 20, 2, ahead);
  for (std::uint64_t i = 0; i < 20; ++i) {
    int const n = 1 + static_cast<int>(7 * i);  // some inside the eight words, some far beyond
    draws_access::seat(d, 9, 100 + i, sy::purpose::run, 0, std::span<std::uint64_t const>(ahead).subspan(8 * i, 8));
    auto const with = take(d, n);
    CHECK(d.words_used() == static_cast<std::uint64_t>(n));
    draws_access::seat(d, 9, 100 + i);
    CHECK(d.words_used() == 0);
    CHECK(take(d, n) == with);
    sy::draws fresh(9, 100 + i);
    CHECK(take(fresh, n) == with);
  }
}

TEST_CASE("recorded words come first, then fresh ones, and all are kept") {
  sy::draws d(1);
  for (std::size_t const given : {0u, 1u, 5u, 8u, 50u}) {
    std::vector<std::uint64_t> record;
    for (std::size_t k = 0; k < given; ++k) record.push_back(1000 + k);
    auto const old = record;
    draws_access::record(d, record, 4, 6, sy::purpose::move, 2);
    std::vector<std::uint64_t> const taken = take(d, 40);
    CHECK(d.words_used() == 40);
    REQUIRE(record.size() >= 40);
    for (std::uint64_t k = 0; k < 40; ++k) {
      CHECK(taken[k] == (k < given ? old[k] : stream_word(k - given, 4, 6, 3, 2)));
      CHECK(record[k] == taken[k]);
    }
    // played again from the record, nothing fresh is needed
    std::vector<std::uint64_t> again(record.begin(), record.begin() + 40);
    draws_access::record(d, again, 8, 8, sy::purpose::move);
    CHECK(take(d, 40) == taken);
    CHECK(again.size() == 40);
  }
}

namespace {

class marked_words final : public sy::word_source {
 public:
  void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first,
            std::span<std::uint64_t> out) const override {
    for (std::size_t k = 0; k < out.size(); ++k) out[k] = seed * 1'000'000 + sample * 1000 + first + k;
  }
};

class broken_words final : public sy::word_source {
 public:
  void fill(std::uint64_t, std::uint64_t, std::uint64_t first, std::span<std::uint64_t> out) const override {
    if (first >= 4) throw sy::bad_argument("only four words");
    for (auto& word : out) word = 1;
  }
};

}  // namespace

TEST_CASE("a custom source feeds the same type") {
  marked_words const source;
  sy::draws d(1);
  draws_access::seat(d, source, 2, 7);
  for (std::uint64_t k = 0; k < 100; ++k) CHECK(d() == 2'007'000 + k);
  CHECK(d.words_used() == 100);
  draws_access::seat(d, 0, 0);
  CHECK(d() == 0x16554d9eca36314cu);

  broken_words const broken;
  draws_access::seat(d, broken, 1, 1);
  take(d, 4);
  CHECK_THROWS_AS(d(), sy::bad_argument);
  CHECK(d.words_used() == 4);
}

TEST_CASE("uniform is the middle of one of 2^52 cells") {
  CHECK(sy::detail::uniform_from_word(0) == 0x1p-53);
  CHECK(sy::detail::uniform_from_word(~std::uint64_t{0}) == 1.0 - 0x1p-53);
  CHECK(sy::detail::uniform_from_word(std::uint64_t{1} << 63) == 0.5 + 0x1p-53);
  CHECK(sy::detail::uniform_from_word(0xfff) == 0x1p-53);
  CHECK(sy::detail::uniform_from_word(0x1000) == 3 * 0x1p-53);
  sy::draws a(3, 1);
  sy::draws b(3, 1);
  for (int k = 0; k < 100; ++k) {
    std::uint64_t const word = b();
    CHECK(a.uniform() == (static_cast<double>(word >> 12) + 0.5) * 0x1p-52);
  }
}

TEST_CASE("uniform on an interval") {
  sy::draws d(1);
  sy::draws twin(1);
  for (int k = 0; k < 1000; ++k) {
    double const x = d.uniform(-3.0, 5.0);
    CHECK(x == doctest::Approx(-3.0 + 8.0 * twin.uniform()).epsilon(1e-15));
    CHECK(x >= -3.0);
    CHECK(x <= 5.0);
  }
  CHECK(d.uniform(2.0, 2.0) == 2.0);
  double const low = 1.0;
  double const high = std::nextafter(1.0, 2.0);
  for (int k = 0; k < 100; ++k) {
    double const x = d.uniform(low, high);
    CHECK((x == low || x == high));
  }
}

TEST_CASE("one word a draw") {
  sy::draws d(1);
  d.uniform();
  d.uniform(1.0, 2.0);
  d.normal();
  d.normal(1.0, 2.0);
  d.exponential(3.0);
  d.chance(0.5);
  CHECK(d.words_used() == 6);
  d.index(6);
  CHECK(d.words_used() == 7);  // more only once in 2^61
}

TEST_CASE("normal and exponential are placed and scaled") {
  sy::draws a(1);
  sy::draws b(1);
  for (int k = 0; k < 100; ++k) {
    CHECK(a.normal(2.0, 0.3) == doctest::Approx(2.0 + 0.3 * b.normal()).epsilon(1e-15));
    CHECK(a.exponential(0.5) == doctest::Approx(2.0 * sy::detail::exponential_from_word(b())).epsilon(1e-15));
  }
  CHECK(a.normal(2.0, 0.0) == 2.0);
}

TEST_CASE("bad arguments are refused in a sentence") {
  double const nan = std::bit_cast<double>(0x7ff8000000000000u);
  double const infinity = std::bit_cast<double>(0x7ff0000000000000u);
  double const largest = std::numeric_limits<double>::max();
  sy::draws d(1);
  CHECK(refusal([&] { d.uniform(2.0, 1.0); }) ==
        "draws::uniform: from 2 to 1 is no interval; the ends must be finite and in order");
  CHECK(refusal([&] { d.uniform(nan, 1.0); }) != "accepted");
  CHECK(refusal([&] { d.uniform(0.0, infinity); }) != "accepted");
  CHECK(refusal([&] { d.uniform(-largest, largest); }) != "accepted");
  CHECK(refusal([&] { d.normal(nan, 1.0); }) == "draws::normal: the mean is NaN; it must be a finite number");
  CHECK(refusal([&] { d.normal(0.0, -1.0); }) ==
        "draws::normal: the standard deviation is -1; it must be zero or a positive finite number");
  CHECK(refusal([&] { d.normal(0.0, nan); }) != "accepted");
  CHECK(refusal([&] { d.normal(infinity, 1.0); }) != "accepted");
  CHECK(refusal([&] { d.exponential(0.0); }) ==
        "draws::exponential: the rate is 0; it must be a positive finite number");
  CHECK(refusal([&] { d.exponential(-2.0); }) != "accepted");
  CHECK(refusal([&] { d.exponential(nan); }) != "accepted");
  CHECK(refusal([&] { d.exponential(infinity); }) != "accepted");
  CHECK(refusal([&] { d.index(0); }) == "draws::index: the number of choices is 0; it must be at least 1");
  CHECK(refusal([&] { d.index(-3); }) != "accepted");
  CHECK(refusal([&] { d.chance(1.5); }) == "draws::chance: the probability is 1.5; it must be between 0 and 1");
  CHECK(refusal([&] { d.chance(-0.1); }) != "accepted");
  CHECK(refusal([&] { d.chance(nan); }) != "accepted");
  CHECK(refusal([&] { sy::draws{-1}; }) != "accepted");
  CHECK(d.words_used() == 0);  // a refusal costs no word
}

TEST_CASE("index is unbiased") {
  // limits: 99.99 % points of chi-square, 33.720 at 9 degrees; 18.421 at 2 is -2 ln(1e-4)
  sy::draws d(1);
  std::vector<int> ten(10);
  for (int k = 0; k < 20'000; ++k) ++ten[d.index(10)];
  CHECK(chi_square(ten, 2000.0) < 33.720);
  // n = 3 * 2^62: without rejection every third outcome would come up twice as often as the others
  std::vector<int> thirds(3);
  for (int k = 0; k < 3000; ++k) ++thirds[d.index(std::uint64_t{3} << 62) % 3];
  CHECK(chi_square(thirds, 1000.0) < 18.421);
  for (int k = 0; k < 100; ++k) CHECK(d.index(1) == 0);
}

TEST_CASE("chance is exact at its ends and unbiased between") {
  sy::draws d(1);
  int hits = 0;
  for (int k = 0; k < 20'000; ++k) {
    CHECK(!d.chance(0.0));
    CHECK(d.chance(1.0));
    if (d.chance(0.3)) ++hits;
  }
  CHECK(std::abs(hits - 6000.0) < 3.9 * std::sqrt(20'000 * 0.3 * 0.7));  // 99.99 %
  // resolved far below the 2^-52 of uniform(): the smallest words decide
  std::array<std::uint64_t, 4> const words = {0, 18, 19, std::uint64_t{1} << 40};
  draws_access::seat(d, 1, 1, sy::purpose::run, 0, words);
  CHECK(d.chance(1e-18));
  CHECK(d.chance(1.04e-18));
  CHECK(!d.chance(1.02e-18));
  CHECK(!d.chance(1e-18));
}

TEST_CASE("standard algorithms and distributions take draws") {
  sy::draws d(1);
  std::vector<int> cards(52);
  for (int k = 0; k < 52; ++k) cards[static_cast<std::size_t>(k)] = k;
  auto const sorted = cards;
  std::shuffle(cards.begin(), cards.end(), d);
  CHECK(cards != sorted);
  CHECK(std::is_permutation(cards.begin(), cards.end(), sorted.begin()));
  double sum = 0.0;
  for (int k = 0; k < 4000; ++k) sum += std::normal_distribution<double>(3.0, 1.0)(d);
  CHECK(std::abs(sum / 4000 - 3.0) < 5.0 / std::sqrt(4000.0));
  int const throw_of_dice = std::uniform_int_distribution<int>(1, 6)(d);
  CHECK(throw_of_dice >= 1);
  CHECK(throw_of_dice <= 6);
}

TEST_CASE("streams do not resemble each other") {
  // first words of neighbouring streams, top four bits, pairs that do not overlap: 256 cells, 99.99 % point of
  // chi-square at 255 degrees by the Wilson-Hilferty formula: 347.7
  std::vector<int> pairs(256);
  for (std::uint64_t i = 0; i < 10'240; ++i) {
    sy::draws a(1, 2 * i);
    sy::draws b(1, 2 * i + 1);
    ++pairs[16 * (a() >> 60) + (b() >> 60)];
  }
  CHECK(chi_square(pairs, 40.0) < 347.7);
}
