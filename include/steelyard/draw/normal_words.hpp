// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>

#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>
#include <steelyard/base/normal.hpp>
#include <steelyard/draw/inversion.hpp>

// Normal deviates from random words, many at a time, on the eight virtual
// lanes of lanes.hpp: the bits of normal_from_word at every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

STEELYARD_DETAIL_EACH_WIDTH(

/// The operations of polynomial().
STEELYARD_DETAIL_INLINE void eight_terms(double const* c, vec const& x, vec const& x2, vec& r) noexcept {
  vec odd; multiply(x2, c[7], odd);
  vec even; multiply(x2, c[6], even);
  add(odd, c[5], odd);
  add(even, c[4], even);
  multiply(odd, x2, odd);
  multiply(even, x2, even);
  add(odd, c[3], odd);
  add(even, c[2], even);
  multiply(odd, x2, odd);
  multiply(even, x2, even);
  add(odd, c[1], odd);
  add(even, c[0], even);
  multiply(odd, x, odd);
  add(odd, even, r);
}

/// Deviates by normal_middle_quantile, right where `distances`, from the middle of (0, 1), are at most 0.425; whole groups of eight.
inline void middle_normals(std::uint64_t const* words, double* out, double* distances, std::size_t groups) noexcept {
  uvec const top = uvec{} + sign_bit;
  for (std::size_t at = 0; at < 8 * groups; at += width) {
    uvec w; __builtin_memcpy(&w, words + at, sizeof w);
    w = w ^ top;
    uvec const negative = uvec{} - (w >> 63);  // all ones below the middle
    w = w ^ negative;
    uvec const high_bits = (w >> 32) | 0x4530000000000000u;  // 2^84 + 2^32 times the upper half
    uvec const low_bits = (w & 0xffffffffu) | 0x4330000000000000u;  // 2^52 + the lower half
    vec high; __builtin_memcpy(&high, &high_bits, sizeof high);
    vec q; __builtin_memcpy(&q, &low_bits, sizeof q);
    subtract(high, 0x1p84 + 0x1p52, high);  // exact
    add(q, high, q);  // the whole number, rounded once
    add(q, 0.5, q);
    multiply(q, 0x1p-64, q);
    store(q, distances + at);
    vec r; multiply(q, q, r);
    subtract(vec{} + 0.180625, r, r);
    vec r2; multiply(r, r, r2);
    vec z; eight_terms(normal_middle_numerator, r, r2, z);
    vec under; eight_terms(normal_middle_denominator, r, r2, under);
    z = z / under;
    hold(z);
    multiply(q, z, z);
    uvec bits; __builtin_memcpy(&bits, &z, sizeof z);
    bits = bits ^ (negative & top);
    __builtin_memcpy(out + at, &bits, sizeof bits);
  }
}

)  // STEELYARD_DETAIL_EACH_WIDTH

/// normal_from_word of many words.
/// @param n  a multiple of 8, at most 64
/// Cost  2 to 3 ns each with 512-bit vectors: most of it for the seventh that lies in the tails, one by one.
inline void normals_from_words(std::uint64_t const* words, double* out, std::size_t n, isa width = widest_isa()) noexcept {
  double distances[64];
  std::size_t const groups = n / virtual_lanes;
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512)
    avx512::middle_normals(words, out, distances, groups);
  else if (width == isa::avx2)
    avx2::middle_normals(words, out, distances, groups);
  else if (width == isa::sse2)
    sse2::middle_normals(words, out, distances, groups);
  else
#endif
    plain::middle_normals(words, out, distances, groups);
  static_cast<void>(width);
  std::size_t far[65], many = 0;  // found without a branch, since none could be foretold
  for (std::size_t k = 0; k < n; ++k) {
    far[many] = k;
    many += distances[k] <= 0.425 ? 0u : 1u;
  }
  for (std::size_t f = 0; f < many; ++f) {
    std::uint64_t const word = words[far[f]];
    double const z = -normal_far_quantile(tail_from_word(word).probability);
    out[far[f]] = word < sign_bit ? -z : z;
  }
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
