// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/draw/first_words.hpp>
#include <steelyard/draw/philox.hpp>
#include <steelyard/draw/philox_blocks.hpp>

#include <array>
#include <cstdint>
#include <vector>

namespace sy = steelyard;
using sy::detail::philox;
using sy::detail::philox_block;

namespace {

// The engine of the C++26 working draft, [rand.eng.philox] and [rand.predef] philox4x64, over the block function: a
// 256-bit counter from 0, key (seed, 0), words handed out Y0 to Y3.
class standard_philox4x64 {
 public:
  explicit standard_philox4x64(std::uint64_t seed) : seed_(seed) {}

  std::uint64_t operator()() {
    if (used_ == 4) {
      words_ = philox(counter_, seed_, 0);
      used_ = 0;
      for (std::uint64_t& word : counter_)
        if (++word != 0) break;
    }
    return words_[used_++];
  }

 private:
  std::uint64_t seed_;
  philox_block counter_{};
  philox_block words_{};
  std::size_t used_ = 4;
};

}  // namespace

TEST_CASE("known answers of philox4x64, ten rounds") {
  // Random123 distribution, tests/kat_vectors, DEShawResearch/random123 commit
  // 9545ff6413f258be2f04c1d319d99aaef7521150 (BSD-3, Copyright 2010-2012 D. E. Shaw Research);
  // Salmon, Moraes, Dror & Shaw, SC11, 2011
  std::uint64_t const ones = ~std::uint64_t{0};
  CHECK(philox({0, 0, 0, 0}, 0, 0) ==
        philox_block{0x16554d9eca36314cu, 0xdb20fe9d672d0fdcu, 0xd7e772cee186176bu, 0x7e68b68aec7ba23bu});
  CHECK(philox({ones, ones, ones, ones}, ones, ones) ==
        philox_block{0x87b092c3013fe90bu, 0x438c3c67be8d0224u, 0x9cc7d7c69cd777b6u, 0xa09caebf594f0ba0u});
  CHECK(philox({0x243f6a8885a308d3u, 0x13198a2e03707344u, 0xa4093822299f31d0u, 0x082efa98ec4e6c89u},
               0x452821e638d01377u, 0xbe5466cf34e90c6cu) ==
        philox_block{0xa528f45403e61d95u, 0x38c72dbd566e9788u, 0xa5a1610e72fd18b5u, 0x57bd43b5e52b7fe6u});
}

TEST_CASE("the block function can be had at compile time") {
  static_assert(philox({0, 0, 0, 0}, 0, 0)[0] == 0x16554d9eca36314cu);
}

TEST_CASE("the C++26 engine philox4x64") {
  standard_philox4x64 engine(20111115);
  std::array<std::uint64_t, 4> const first = {engine(), engine(), engine(), engine()};
  // recomputed apart from this library
  CHECK(first == std::array<std::uint64_t, 4>{4854577551194240716u, 11024447680751626801u, 6491473261962256061u,
                                              17735969495851009945u});
  for (int k = 4; k < 9999; ++k) engine();
  CHECK(engine() == 3409172418970261260u);  // [rand.predef]: the 10 000th
  for (int k = 10'000; k < 999'999; ++k) engine();
  CHECK(engine() == 9716675337971449048u);  // recomputed apart from this library
}

TEST_CASE("both halves of a product") {
  static_assert(sy::detail::multiply_wide(~std::uint64_t{0}, ~std::uint64_t{0}).high == ~std::uint64_t{1});
  static_assert(sy::detail::multiply_wide(~std::uint64_t{0}, ~std::uint64_t{0}).low == 1);
  static_assert(sy::detail::multiply_wide(0x100000000u, 0x100000000u).high == 1);
}

TEST_CASE("first words of many streams are those of each stream, at every width") {
  for (sy::detail::isa const width :
       {sy::detail::isa::plain, sy::detail::isa::sse2, sy::detail::isa::avx2, sy::detail::isa::avx512}) {
    if (width > sy::detail::widest_isa()) continue;
    for (std::uint64_t const streams : {1u, 7u, 8u, 9u, 64u, 67u})
      for (std::uint64_t const blocks : {1u, 2u, 3u, 5u}) {
        std::vector<std::uint64_t> all(4 * streams * blocks + 1, 99);
        std::uint64_t const first = ~std::uint64_t{0} - 20;  // wraps around
        sy::detail::first_words(77, sy::purpose::move, 5, first, streams, blocks,
                                std::span<std::uint64_t>(all.data(), all.size() - 1), width);
        bool same = true;
        for (std::uint64_t s = 0; s < streams; ++s)
          for (std::uint64_t b = 0; b < blocks; ++b) {
            philox_block const want = philox({b, first + s, 3, 5}, 77, 0);
            for (std::uint64_t k = 0; k < 4; ++k) same = same && all[4 * (s * blocks + b) + k] == want[k];
          }
        CHECK_MESSAGE(same, streams, " streams, ", blocks, " blocks");
        CHECK(all.back() == 99);
      }
  }
}

TEST_CASE("words of one stream from any block on") {
  for (std::uint64_t const blocks : {1u, 4u, 7u, 8u, 9u, 16u, 19u}) {
    std::vector<std::uint64_t> all(4 * blocks);
    sy::detail::stream_words(3, 12, sy::purpose::run, 1, 40, all);
    bool same = true;
    for (std::uint64_t b = 0; b < blocks; ++b) {
      philox_block const want = philox({40 + b, 12, 0, 1}, 3, 0);
      for (std::uint64_t k = 0; k < 4; ++k) same = same && all[4 * b + k] == want[k];
    }
    CHECK(same);
  }
}
