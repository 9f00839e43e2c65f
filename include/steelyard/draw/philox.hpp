// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstdint>

namespace steelyard::inline v1::detail {

/// Counter and output of one Philox block: four 64-bit words, word 0 first.
using philox_block = std::array<std::uint64_t, 4>;

/// Both halves of a * b.
struct wide_product {
  std::uint64_t high;
  std::uint64_t low;
};

constexpr wide_product multiply_wide(std::uint64_t a, std::uint64_t b) noexcept {
#if defined(__SIZEOF_INT128__)
  __extension__ using wide = unsigned __int128;
  wide const product = static_cast<wide>(a) * b;
  return {static_cast<std::uint64_t>(product >> 64), static_cast<std::uint64_t>(product)};
#else
  std::uint64_t const half = 0xffffffffu;
  std::uint64_t const low = (a & half) * (b & half);
  std::uint64_t const cross = (a >> 32) * (b & half) + (low >> 32);
  std::uint64_t const other = (a & half) * (b >> 32) + (cross & half);
  return {(a >> 32) * (b >> 32) + (cross >> 32) + (other >> 32), (other << 32) | (low & half)};
#endif
}

inline constexpr std::uint64_t philox_multiplier_0 = 0xD2E7470EE14C6C93u;  // on counter word 0
inline constexpr std::uint64_t philox_multiplier_1 = 0xCA5A826395121157u;  // on counter word 2
inline constexpr std::uint64_t philox_weyl_0 = 0x9E3779B97F4A7C15u;        // added to key word 0 each round
inline constexpr std::uint64_t philox_weyl_1 = 0xBB67AE8584CAA73Bu;        // added to key word 1 each round

/// A counter on its way to the output, and the key of the round.
struct philox_state {
  std::uint64_t x0, x1, x2, x3;
  std::uint64_t key_0, key_1;
};

constexpr void philox_round(philox_state& s) noexcept {
  wide_product const a = multiply_wide(philox_multiplier_0, s.x0);
  wide_product const b = multiply_wide(philox_multiplier_1, s.x2);
  s.x0 = b.high ^ s.x1 ^ s.key_0;
  s.x1 = b.low;
  s.x2 = a.high ^ s.x3 ^ s.key_1;
  s.x3 = a.low;
  s.key_0 += philox_weyl_0;
  s.key_1 += philox_weyl_1;
}

/// One block of Philox4x64-10: a fixed scrambling of a 256-bit counter under
/// a 128-bit key, so that any word of any stream can be had directly.
///   [Salmon, Moraes, Dror & Shaw, SC11, 2011; C++26 rand.eng.philox]
/// Cost  20 wide products, 8 to 15 ns.
constexpr philox_block philox(philox_block const& counter, std::uint64_t key_0, std::uint64_t key_1) noexcept {
  philox_state s{counter[0], counter[1], counter[2], counter[3], key_0, key_1};
  philox_round(s);  // ten, written out: compilers leave the loop rolled, at twice the time
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  philox_round(s);
  return {s.x0, s.x1, s.x2, s.x3};
}

}  // namespace steelyard::inline v1::detail
