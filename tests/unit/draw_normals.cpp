// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/normal_words.hpp>
#include <steelyard/run/pipeline.hpp>

#include <bit>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

std::uint64_t bits(double x) { return std::bit_cast<std::uint64_t>(x); }

/// Words at both ends, about the middle, on either side of where the tails begin, and many others.
std::vector<std::uint64_t> some_words() {
  std::vector<std::uint64_t> words;
  auto const middle = std::uint64_t{1} << 63;
  auto const to_tail = static_cast<std::uint64_t>(0.425 * 0x1p64);
  for (std::uint64_t const near : {std::uint64_t{0}, middle, middle + to_tail, middle - to_tail})
    for (std::uint64_t const step : {std::uint64_t{1}, std::uint64_t{1} << 11, std::uint64_t{1} << 32, std::uint64_t{1} << 50})
      for (std::uint64_t k = 0; k < 8; ++k) words.push_back(near + step * (k - 4));
  sy::draws source(7);
  while (words.size() < 4000) words.push_back(source());
  return words;
}

}  // namespace

TEST_CASE("normal deviates made many at a time have the bits of those made one by one, at every width") {
  std::vector<std::uint64_t> const words = some_words();
  for (detail::isa const width : {detail::isa::plain, detail::isa::sse2, detail::isa::avx2, detail::isa::avx512}) {
    if (width > detail::widest_isa()) continue;
    std::size_t wrong = 0;
    for (std::size_t const n : {8u, 40u, 64u})
      for (std::size_t at = 0; at + n <= words.size(); at += n) {
        double made[64];
        detail::normals_from_words(words.data() + at, made, n, width);
        for (std::size_t k = 0; k < n; ++k) wrong += bits(made[k]) == bits(detail::normal_from_word(words[at + k])) ? 0u : 1u;
      }
    CAPTURE(static_cast<int>(width));
    CHECK(wrong == 0);
  }
}

namespace {

/// Every kind of draw, in an order and a number that change from sample to sample.
double all_kinds(sy::draws& d) {
  double sum = 0.0;
  std::uint64_t const first = d();
  for (std::uint64_t k = 0; k < first % 7 * (first % 5) + 1; ++k) {
    sum = 0.25 * sum + d.normal();
    if ((first >> k % 60 & 1u) != 0) sum += d.uniform();
    if ((first >> (k + 3) % 60 & 1u) != 0) sum += d.normal(1.0, 2.0) + d.exponential(3.0);
    if (first % 11 == 3) sum += static_cast<double>(d() >> 60);
  }
  return sum;
}

}  // namespace

TEST_CASE("a sample draws the same in a run, where deviates are made ahead, as from its own stream alone") {
  auto const flat = [](double) { return sy::log_likelihood{0.0}; };
  auto const one_normal = [](sy::draws& d) { return d.normal(); };
  auto const late = [](sy::draws& d) { return d.uniform() + d.normal() + (d.words_used() == 2 ? 0.0 : 100.0); };
  auto const compare = [&](auto const& sampler, std::size_t size) {
    auto const sample = sy::pipeline(sampler, flat).run({.size = size, .seed = 9});
    std::size_t wrong = 0;
    for (std::size_t i = 0; i < size; ++i) {
      sy::draws alone(9, i);
      wrong += bits(sample.state(i)) == bits(sampler(alone)) ? 0u : 1u;
    }
    CHECK(wrong == 0);
  };
  for (std::size_t const size : {1u, 63u, 64u, 65u, 1024u, 1030u, 5000u}) {
    compare(all_kinds, size);
    compare(one_normal, size);
    compare(late, size);
  }
}
