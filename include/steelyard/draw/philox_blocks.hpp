// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>

#include <steelyard/base/isa.hpp>
#include <steelyard/draw/philox.hpp>

namespace steelyard::inline v1::detail {

/// Which blocks to make under key (seed, 0), and where to: block j goes to
/// out[j stride .. j stride + 3].
struct philox_blocks {
  philox_block counter;
  std::uint64_t seed;
  std::uint64_t* out;
  std::uint64_t stride;
  std::uint64_t size;
};

/// Counter word that grows by one from block to block: the blocks of one
/// stream, or one block of each of many streams. A constant to the compiler,
/// which then takes what the other words need out of the loop: a fifth of it.
enum class along { blocks = 0, streams = 1 };

template <along Which>
void make_blocks(philox_blocks const& want, std::uint64_t first) noexcept {
  philox_block counter = want.counter;
  std::uint64_t const from = counter[static_cast<std::size_t>(Which)];
  std::uint64_t* to = want.out + first * want.stride;
  for (std::uint64_t j = first; j < want.size; ++j, to += want.stride) {
    counter[static_cast<std::size_t>(Which)] = from + j;
    philox_block const words = philox(counter, want.seed, 0);
    to[0] = words[0];
    to[1] = words[1];
    to[2] = words[2];
    to[3] = words[3];
  }
}

#if !defined(STEELYARD_PLAIN_KERNELS) && defined(__GNUC__) && defined(__x86_64__)
namespace avx512 {

typedef std::uint64_t words_8 __attribute__((vector_size(64)));

/// Product of the low halves of each word.
__attribute__((target("avx512f"), always_inline)) inline void multiply_halves(words_8 const& a, words_8 const& b,
                                                                              words_8& product) noexcept {
#if defined(__clang__)
  product = (a & 0xffffffffu) * (b & 0xffffffffu);  // one instruction
#else
  typedef int ints __attribute__((vector_size(64)));
  typedef long long longs __attribute__((vector_size(64)));
  product = (words_8)__builtin_ia32_pmuludq512_mask((ints)a, (ints)b, longs{}, static_cast<unsigned char>(0xff));
#endif
}

/// Both halves of x * multiplier.
__attribute__((target("avx512f"), always_inline)) inline void multiply_wide(words_8 const& x, std::uint64_t multiplier,
                                                                            words_8& high, words_8& low) noexcept {
  words_8 const m_low = words_8{} + (multiplier & 0xffffffffu);
  words_8 const m_high = words_8{} + (multiplier >> 32);
  words_8 const x_high = x >> 32;
  words_8 ll, lh, hl, hh;
  multiply_halves(x, m_low, ll);
  multiply_halves(x, m_high, lh);
  multiply_halves(x_high, m_low, hl);
  multiply_halves(x_high, m_high, hh);
  words_8 const cross = lh + (ll >> 32);  // cannot overflow
  words_8 const other = hl + (cross & 0xffffffffu);
  high = hh + (cross >> 32) + (other >> 32);
  low = (other << 32) | (ll & 0xffffffffu);
}

struct state_8 {
  words_8 x0, x1, x2, x3;
  std::uint64_t key_0, key_1;
};

__attribute__((target("avx512f"), always_inline)) inline void philox_round(state_8& s) noexcept {
  words_8 a_high, a_low, b_high, b_low;
  multiply_wide(s.x0, philox_multiplier_0, a_high, a_low);
  multiply_wide(s.x2, philox_multiplier_1, b_high, b_low);
  s.x0 = b_high ^ s.x1 ^ s.key_0;
  s.x1 = b_low;
  s.x2 = a_high ^ s.x3 ^ s.key_1;
  s.x3 = a_low;
  s.key_0 += philox_weyl_0;
  s.key_1 += philox_weyl_1;
}

/// From word by word to block by block.
__attribute__((target("avx512f"), always_inline)) inline void store_blocks(state_8 const& s, std::uint64_t* out,
                                                                           std::uint64_t stride) noexcept {
  words_8 const a = __builtin_shufflevector(s.x0, s.x1, 0, 8, 2, 10, 4, 12, 6, 14);
  words_8 const b = __builtin_shufflevector(s.x0, s.x1, 1, 9, 3, 11, 5, 13, 7, 15);
  words_8 const c = __builtin_shufflevector(s.x2, s.x3, 0, 8, 2, 10, 4, 12, 6, 14);
  words_8 const d = __builtin_shufflevector(s.x2, s.x3, 1, 9, 3, 11, 5, 13, 7, 15);
  words_8 blocks[4];  // 0 and 4, 1 and 5, 2 and 6, 3 and 7
  blocks[0] = __builtin_shufflevector(a, c, 0, 1, 8, 9, 4, 5, 12, 13);
  blocks[1] = __builtin_shufflevector(b, d, 0, 1, 8, 9, 4, 5, 12, 13);
  blocks[2] = __builtin_shufflevector(a, c, 2, 3, 10, 11, 6, 7, 14, 15);
  blocks[3] = __builtin_shufflevector(b, d, 2, 3, 10, 11, 6, 7, 14, 15);
  if (stride == 4) {
    words_8 const w0 = __builtin_shufflevector(blocks[0], blocks[1], 0, 1, 2, 3, 8, 9, 10, 11);
    words_8 const w1 = __builtin_shufflevector(blocks[2], blocks[3], 0, 1, 2, 3, 8, 9, 10, 11);
    words_8 const w2 = __builtin_shufflevector(blocks[0], blocks[1], 4, 5, 6, 7, 12, 13, 14, 15);
    words_8 const w3 = __builtin_shufflevector(blocks[2], blocks[3], 4, 5, 6, 7, 12, 13, 14, 15);
    __builtin_memcpy(out, &w0, 64);
    __builtin_memcpy(out + 8, &w1, 64);
    __builtin_memcpy(out + 16, &w2, 64);
    __builtin_memcpy(out + 24, &w3, 64);
    return;
  }
  for (std::uint64_t j = 0; j < 4; ++j) {
    __builtin_memcpy(out + j * stride, &blocks[j], 32);
    __builtin_memcpy(out + (j + 4) * stride, reinterpret_cast<char const*>(&blocks[j]) + 32, 32);
  }
}

/// Whole groups of eight; returns how many blocks that were.
template <along Which>
__attribute__((target("avx512f"))) std::uint64_t make_blocks(philox_blocks const& want) noexcept {
  words_8 const index = {0, 1, 2, 3, 4, 5, 6, 7};
  philox_block const counter = want.counter;
  std::uint64_t const stride = want.stride;
  std::uint64_t const seed = want.seed;
  std::uint64_t* out = want.out;
  std::uint64_t const made = want.size / 8 * 8;
  for (std::uint64_t j = 0; j < made; j += 8, out += 8 * stride) {
    state_8 s;
    s.x0 = words_8{} + counter[0];
    s.x1 = words_8{} + counter[1];
    s.x2 = words_8{} + counter[2];
    s.x3 = words_8{} + counter[3];
    if constexpr (Which == along::blocks)
      s.x0 = s.x0 + index + j;
    else
      s.x1 = s.x1 + index + j;
    s.key_0 = seed;
    s.key_1 = 0;
    philox_round(s);  // ten, written out as in philox.hpp
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    philox_round(s);
    store_blocks(s, out, stride);
  }
  return made;
}

}  // namespace avx512
#endif

/// The blocks, on the given vector width. Only 512-bit vectors pay: eight
/// products at once take half the time of eight in turn, four do not.
template <along Which>
void make_blocks(isa width, philox_blocks const& want) noexcept {
  std::uint64_t made = 0;
#if !defined(STEELYARD_PLAIN_KERNELS) && defined(__GNUC__) && defined(__x86_64__)
  if (width == isa::avx512) made = avx512::make_blocks<Which>(want);
#endif
  static_cast<void>(width);
  make_blocks<Which>(want, made);
}

}  // namespace steelyard::inline v1::detail
