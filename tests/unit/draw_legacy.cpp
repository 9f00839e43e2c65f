// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/legacy.hpp>

#include <cmath>
#include <cstdint>
#include <iterator>
#include <memory>
#include <optional>
#include <random>
#include <set>
#include <type_traits>
#include <vector>

namespace sy = steelyard;

namespace {

double legacy(std::mt19937_64& engine) { return std::normal_distribution<double>(1.0, 2.0)(engine); }

template <class Engine>
void every_stream_its_own() {
  auto const first_value = sy::with_engine<Engine>([](Engine& engine) { return engine(); });
  std::set<std::uint64_t> seen;
  for (std::uint64_t i = 0; i < 500; ++i) {
    sy::draws d(1, i);
    std::uint64_t const value = first_value(d);
    CHECK(d.words_used() == 2);
    seen.insert(value);
    sy::draws again(1, i);
    CHECK(first_value(again) == value);
  }
  CHECK(seen.size() > 498);  // 32-bit outputs themselves meet once in 34 000 pairs of this many
}

}  // namespace

TEST_CASE("each sample has an engine of its own, the same again from the same stream") {
  every_stream_its_own<std::mt19937>();
  every_stream_its_own<std::mt19937_64>();
  every_stream_its_own<std::minstd_rand>();
  every_stream_its_own<std::ranlux48>();
}

TEST_CASE("32-bit engines do not meet: 128 bits of the stream reach their state") {
  // 20 000 streams: seeded by one 32-bit number each, some 0.05 pairs; so compare whole states of engines
  // whose first 64 bits of seed agree
  sy::detail::seed_words const a(1, 2);
  sy::detail::seed_words const b(1, 3);
  std::vector<std::uint_least32_t> from_a(624);
  std::vector<std::uint_least32_t> from_b(624);
  a.generate(from_a.begin(), from_a.end());
  b.generate(from_b.begin(), from_b.end());
  int equal = 0;
  for (std::size_t k = 0; k < from_a.size(); ++k) equal += from_a[k] == from_b[k];
  CHECK(equal <= 1);
  std::set<std::uint_least32_t> const distinct(from_a.begin(), from_a.end());
  CHECK(distinct.size() >= 623);
  std::vector<std::uint_least32_t> start(5);
  a.generate(start.begin(), start.end());
  CHECK(std::vector<std::uint_least32_t>(from_a.begin(), from_a.begin() + 5) == start);
}

TEST_CASE("seed words are the two halves of Philox words under the stream's two words as key") {
  sy::detail::seed_words const seeds(11, 12);
  std::vector<std::uint_least32_t> words(11);
  seeds.generate(words.begin(), words.end());
  for (std::size_t k = 0; k < words.size(); ++k) {
    std::uint64_t const word = sy::detail::philox({k / 8, 0, 0, 0}, 11, 12)[k % 8 / 2];
    CHECK(words[k] == static_cast<std::uint32_t>(k % 2 == 0 ? word : word >> 32));
  }
  std::vector<std::uint_least32_t> given;
  seeds.param(std::back_inserter(given));
  CHECK(given == std::vector<std::uint_least32_t>{11, 0, 12, 0});
}

TEST_CASE("a legacy generator has the distribution it had") {
  auto const sampler = sy::with_engine<std::mt19937_64>(legacy);
  sy::draws d(1);
  double sum = 0.0;
  double squares = 0.0;
  int const n = 2000;
  for (std::uint64_t i = 0; i < n; ++i) {
    sy::detail::draws_access::seat(d, 1, i);
    double const x = sampler(d);
    sum += x;
    squares += (x - 1.0) * (x - 1.0);
  }
  CHECK(std::abs(sum / n - 1.0) < 5.0 * 2.0 / std::sqrt(n));
  CHECK(std::abs(squares / n - 4.0) < 5.0 * 4.0 * std::sqrt(2.0 / n));
}

TEST_CASE("what a generator returns passes through: move-only, optional") {
  auto const owning = sy::with_seed([](std::uint64_t seed) { return std::make_unique<std::uint64_t>(seed); });
  auto const maybe = sy::with_engine<std::mt19937>([](std::mt19937& e) { return std::optional<int>(int(e() % 2)); });
  sy::draws d(3, 4);
  sy::draws twin(3, 4);
  CHECK(*owning(d) == twin());
  static_assert(std::is_same_v<decltype(maybe(d)), std::optional<int>>);
  CHECK(maybe(d).has_value());
}

TEST_CASE("with_seed hands over one word of the stream") {
  auto const sampler = sy::with_seed([](std::uint64_t seed) { return seed; });
  sy::draws d(1, 5);
  sy::draws twin(1, 5);
  CHECK(sampler(d) == twin());
  CHECK(d.words_used() == 1);
}
