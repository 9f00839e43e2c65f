// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>

#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>

// Exponential deviates from random words, many at a time, on the eight virtual
// lanes of lanes.hpp: the same bits at every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

STEELYARD_DETAIL_EACH_WIDTH(

/// -log(u), u the middle of the word's cell of 2^-52.
STEELYARD_DETAIL_INLINE void minus_log(std::uint64_t const* words, vec& r) noexcept {
  constexpr std::uint64_t one = 0x3ff0000000000000u;
  constexpr std::uint64_t root_half = 0x3fe6a09e667f3bcdu;
  constexpr std::uint64_t lift = 0x4000000000000000u;  // keeps the difference positive, for a shift of plain bits
  uvec w; __builtin_memcpy(&w, words, sizeof w);
  w = (w >> 12) | one;
  vec u; __builtin_memcpy(&u, &w, sizeof u);
  subtract(u, 1.0, u);
  add(u, 0x1p-53, u);  // exact
  uvec bits; __builtin_memcpy(&bits, &u, sizeof u);
  uvec const exponent = (bits - root_half + lift) >> 52;
  bits = bits - (exponent << 52) + lift;
  uvec const whole = exponent | 0x4330000000000000u;
  vec n; __builtin_memcpy(&n, &whole, sizeof n);
  subtract(n, 0x1p52 + 1024.0, n);
  vec f; __builtin_memcpy(&f, &bits, sizeof f);
  subtract(f, 1.0, f);
  vec s; add(f, 2.0, s);
  s = f / s;
  hold(s);
  vec z; multiply(s, s, z);
  vec z2; multiply(z, z, z2);
  vec even; multiply(z2, log_coefficients[6], even);
  add(even, log_coefficients[4], even);
  multiply(even, z2, even);
  add(even, log_coefficients[2], even);
  multiply(even, z2, even);
  add(even, log_coefficients[0], even);
  vec odd; multiply(z2, log_coefficients[5], odd);
  add(odd, log_coefficients[3], odd);
  multiply(odd, z2, odd);
  add(odd, log_coefficients[1], odd);
  multiply(odd, z, odd);
  add(even, odd, even);
  multiply(even, z, even);
  subtract(f, even, even);  // log(1 + f) = f - s (f - bend)
  multiply(even, s, even);
  vec t; multiply(n, ln2_low, t);
  subtract(even, t, even);
  subtract(even, f, even);
  multiply(n, ln2_high, t);
  subtract(even, t, r);
}

/// Whole groups of eight.
inline void exponentials(std::uint64_t const* words, double* out, std::size_t groups) noexcept {
  for (std::size_t at = 0; at < 8 * groups; at += width) {
    vec r; minus_log(words + at, r);
    store(r, out + at);
  }
}

)  // STEELYARD_DETAIL_EACH_WIDTH

/// Exponential deviates of rate 1, -log(u) with u = ((word >> 12) + 1/2) 2^-52: within 1.2 units in the last place.
/// Unlike `exponential_from_word` they have 2^-53 as their smallest value, which suits spacings, and rise as the word falls.
/// @pre  out.size() == words.size(), a multiple of 8
/// Cost  about 1 ns each with 512-bit vectors.
inline void exponentials_from_words(std::span<std::uint64_t const> words, std::span<double> out,
                                    isa width = widest_isa()) noexcept {
  std::size_t const groups = words.size() / virtual_lanes;
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512) return avx512::exponentials(words.data(), out.data(), groups);
  if (width == isa::avx2) return avx2::exponentials(words.data(), out.data(), groups);
  if (width == isa::sse2) return sse2::exponentials(words.data(), out.data(), groups);
#endif
  static_cast<void>(width);
  plain::exponentials(words.data(), out.data(), groups);
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
