// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>

// Numbers turned to whole shares and added up, and points laid among such sums. A share takes three rounded operations,
// all else is whole numbers: the same at every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

/// Behind the last of the sums that points are laid among stand so many that no point reaches.
inline constexpr std::size_t share_padding = 8;
inline constexpr std::uint64_t out_of_reach = (std::uint64_t{1} << 63) - 1;

namespace plain {
using svec = std::int64_t;
/// The whole number below v. @pre 1/2 <= v < 2^63
STEELYARD_DETAIL_INLINE void to_whole(vec const& v, uvec& r) noexcept {
  r = static_cast<std::uint64_t>(static_cast<std::int64_t>(v));
}
/// Running sums of v from `sum` on, which becomes the last of them.
STEELYARD_DETAIL_INLINE void add_up(uvec& v, uvec& sum) noexcept { v = sum = sum + v; }
/// In how many places a > b.
STEELYARD_DETAIL_INLINE std::size_t count_above(svec const& a, svec const& b) noexcept { return a > b ? 1 : 0; }
}  // namespace plain

#if defined(STEELYARD_DETAIL_AVX2)
namespace sse2 {
typedef long long svec __attribute__((vector_size(16)));
STEELYARD_DETAIL_INLINE void to_whole(vec const& v, uvec& r) noexcept {
  r = uvec{static_cast<std::uint64_t>(static_cast<std::int64_t>(v[0])), static_cast<std::uint64_t>(static_cast<std::int64_t>(v[1]))};
}
STEELYARD_DETAIL_INLINE void add_up(uvec& v, uvec& sum) noexcept {
  v = v + __builtin_shufflevector(uvec{}, v, 0, 2);
  v = v + sum;
  sum = __builtin_shufflevector(v, v, 1, 1);
}
STEELYARD_DETAIL_INLINE std::size_t count_above(svec const& a, svec const& b) noexcept {
  svec const n = a > b;
  return static_cast<std::size_t>(-n[0] - n[1]);
}
}  // namespace sse2

// The bits of a number hold its leading 53 places as a whole number, which only has to be shifted.
#define STEELYARD_DETAIL_TO_WHOLE                                           \
  STEELYARD_DETAIL_INLINE void to_whole(vec const& v, uvec& r) noexcept {   \
    uvec bits;                                                              \
    __builtin_memcpy(&bits, &v, sizeof v);                                  \
    uvec const places = (bits & 0x000fffffffffffffu) | 0x0010000000000000u; \
    r = (places << 10) >> (1085 - (bits >> 52));                            \
  }

STEELYARD_DETAIL_AVX2 namespace avx2 {
typedef long long svec __attribute__((vector_size(32)));
STEELYARD_DETAIL_TO_WHOLE
STEELYARD_DETAIL_INLINE void add_up(uvec& v, uvec& sum) noexcept {
  v = v + __builtin_shufflevector(uvec{}, v, 0, 4, 5, 6);
  v = v + __builtin_shufflevector(uvec{}, v, 0, 1, 4, 5);
  uvec const all = __builtin_shufflevector(v, v, 3, 3, 3, 3);
  v = v + sum;
  sum = sum + all;
}
STEELYARD_DETAIL_INLINE std::size_t count_above(svec const& a, svec const& b) noexcept {
  return static_cast<std::size_t>(__builtin_popcount(static_cast<unsigned>(__builtin_ia32_movmskpd256((vec)(a > b)))));
}
}
STEELYARD_DETAIL_POP STEELYARD_DETAIL_AVX512 namespace avx512 {
typedef long long svec __attribute__((vector_size(64)));
STEELYARD_DETAIL_TO_WHOLE
STEELYARD_DETAIL_INLINE void add_up(uvec& v, uvec& sum) noexcept {
  v = v + __builtin_shufflevector(uvec{}, v, 0, 8, 9, 10, 11, 12, 13, 14);
  v = v + __builtin_shufflevector(uvec{}, v, 0, 1, 8, 9, 10, 11, 12, 13);
  v = v + __builtin_shufflevector(uvec{}, v, 0, 1, 2, 3, 8, 9, 10, 11);
  uvec const all = __builtin_shufflevector(v, v, 7, 7, 7, 7, 7, 7, 7, 7);
  v = v + sum;
  sum = sum + all;
}
STEELYARD_DETAIL_INLINE std::size_t count_above(svec const& a, svec const& b) noexcept {
  auto const above = static_cast<unsigned>(__builtin_ia32_cmpq512_mask(a, b, 6, static_cast<unsigned char>(0xff)));
  return static_cast<std::size_t>(__builtin_popcount(above & 0xffu));
}
}
STEELYARD_DETAIL_POP
#undef STEELYARD_DETAIL_TO_WHOLE
#endif

/// The first of n sums that is above the point, by bisection without branches. @pre the last one is
inline std::size_t first_above(std::uint64_t const* sums, std::size_t n, std::uint64_t point) noexcept {
  std::size_t i = 0;
  while (n > 1) {
    std::size_t const half = n / 2;
    i += half & (std::size_t{0} - static_cast<std::size_t>(sums[i + half - 1] <= point));
    n -= half;
  }
  return i;
}

STEELYARD_DETAIL_EACH_WIDTH(

/// sums[i] = (sum + shares of the first i + 1 numbers) >> shift, for whole groups of eight; a share is number * lift *
/// factor, rounded to the nearest whole number. Returns the sum of all.
inline std::uint64_t running_sums(double const* numbers, double lift, double factor, std::uint64_t sum, int shift,
                                  std::uint64_t* sums, std::size_t groups) noexcept {
  uvec so_far = uvec{} + sum;
  for (std::size_t at = 0; at < 8 * groups; at += width) {
    if (at % 8 == 0) fetch_ahead(numbers + at, 8192);  // processors stop at the end of a page
    vec v; load(numbers + at, v);
    multiply(v, lift, v);
    multiply(v, factor, v);
    add(v, 0.5, v);
    uvec u; to_whole(v, u);
    add_up(u, so_far);
    u = u >> shift;
    __builtin_memcpy(sums + at, &u, sizeof u);
  }
  __builtin_memcpy(&sum, &so_far, sizeof sum);
  return sum;
}

STEELYARD_DETAIL_INLINE void spread(std::uint64_t from, svec& v) noexcept { v = svec{} + static_cast<std::int64_t>(from); }

STEELYARD_DETAIL_INLINE void pass(svec const& points, std::uint64_t sum, svec& passed) noexcept {
  svec s; spread(sum, s);
  passed = points >= s ? passed + 1 : passed;
}

/// Adds to `passed` how many of `width` sums each point has passed.
STEELYARD_DETAIL_INLINE void pass_some(svec const& points, std::uint64_t const* sums, svec& passed) noexcept {
  pass(points, sums[0], passed);
  if constexpr (width > 1) pass(points, sums[1], passed);
  if constexpr (width > 2) {
    pass(points, sums[2], passed);
    pass(points, sums[3], passed);
  }
  if constexpr (width > 4) {
    pass(points, sums[4], passed);
    pass(points, sums[5], passed);
    pass(points, sums[6], passed);
    pass(points, sums[7], passed);
  }
}

/// A stretch of points, and how far it is laid: point j is the next, and i sums are below it.
struct strand {
  std::size_t j;
  std::size_t i;
  std::size_t end;
};

/// Lays as many points as fall among the next `width` sums, or the next `width` points, whichever is less; one point
/// among four sums where vectors are short. Without branches: what it writes too much is written again later.
STEELYARD_DETAIL_INLINE void lay_some(std::uint64_t const* points, std::uint64_t const* sums, std::size_t first,
                                      std::size_t* places, strand& at) noexcept {
  if constexpr (width < 4) {
    std::uint64_t const point = points[at.j];
    std::uint64_t const* const s = sums + at.i;
    std::size_t const below = (std::size_t{s[0] <= point} + std::size_t{s[1] <= point}) +
                              (std::size_t{s[2] <= point} + std::size_t{s[3] <= point});
    at.i += below;
    places[at.j] = first + at.i;
    at.j += 1 - below / 4;
    return;
  }
  svec p; __builtin_memcpy(&p, points + at.j, sizeof p);
  svec s; __builtin_memcpy(&s, sums + at.i, sizeof s);
  svec passed; spread(first + at.i, passed);
  pass_some(p, sums + at.i, passed);
  __builtin_memcpy(places + at.j, &passed, sizeof passed);
  svec top; spread(sums[at.i + width - 1], top);
  svec last; spread(points[at.j + width - 1], last);
  at.j += count_above(top, p);
  at.i += width - count_above(s, last);
}

/// The last few points of a strand, together with those before them that make up a whole vector.
STEELYARD_DETAIL_INLINE void lay_last(std::uint64_t const* points, std::uint64_t const* sums, std::size_t first,
                                      std::size_t* places, strand const& at) noexcept {
  if (at.j == at.end) return;
  std::size_t const from = at.end - width;
  svec p; __builtin_memcpy(&p, points + from, sizeof p);
  svec passed; spread(places[from], passed);
  std::size_t i = places[from] - first;
  pass_some(p, sums + i, passed);
  while (sums[i + width - 1] <= points[at.end - 1]) {
    i += width;
    pass_some(p, sums + i, passed);
  }
  __builtin_memcpy(places + from, &passed, sizeof passed);
}

/// places[j] = first + number of sums that points[j] has passed; both rise. In three stretches of points at a time, so
/// that each one's waits are filled by the others.
/// @pre  the last sum is above all points, and `share_padding` sums out of reach stand behind it
inline void lay_points(std::uint64_t const* points, std::size_t size, std::uint64_t const* sums, std::size_t n,
                       std::size_t first, std::size_t* places) noexcept {
  if (size < 6 * width) {
    std::size_t i = 0;
    for (std::size_t j = 0; j < size; ++j) {
      while (sums[i] <= points[j]) ++i;
      places[j] = first + i;
    }
    return;
  }
  std::size_t const third = size / 3;
  strand a = {0, 0, third};
  strand b = {third, first_above(sums, n, points[third]), 2 * third};
  strand c = {2 * third, first_above(sums, n, points[2 * third]), size};
  while (a.j + width <= a.end && b.j + width <= b.end && c.j + width <= c.end) {
    lay_some(points, sums, first, places, a);
    lay_some(points, sums, first, places, b);
    lay_some(points, sums, first, places, c);
  }
  while (a.j + width <= a.end) lay_some(points, sums, first, places, a);
  while (b.j + width <= b.end) lay_some(points, sums, first, places, b);
  while (c.j + width <= c.end) lay_some(points, sums, first, places, c);
  lay_last(points, sums, first, places, a);
  lay_last(points, sums, first, places, b);
  lay_last(points, sums, first, places, c);
}

)  // STEELYARD_DETAIL_EACH_WIDTH

inline std::uint64_t running_sums(isa width, double const* numbers, double lift, double factor, std::uint64_t sum, int shift,
                                  std::uint64_t* sums, std::size_t groups) noexcept {
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512) return avx512::running_sums(numbers, lift, factor, sum, shift, sums, groups);
  if (width == isa::avx2) return avx2::running_sums(numbers, lift, factor, sum, shift, sums, groups);
  if (width == isa::sse2) return sse2::running_sums(numbers, lift, factor, sum, shift, sums, groups);
#endif
  static_cast<void>(width);
  return plain::running_sums(numbers, lift, factor, sum, shift, sums, groups);
}

inline void lay_points(isa width, std::uint64_t const* points, std::size_t size, std::uint64_t const* sums, std::size_t n,
                       std::size_t first, std::size_t* places) noexcept {
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512) return avx512::lay_points(points, size, sums, n, first, places);
  if (width == isa::avx2) return avx2::lay_points(points, size, sums, n, first, places);
  if (width == isa::sse2) return sse2::lay_points(points, size, sums, n, first, places);
#endif
  static_cast<void>(width);
  plain::lay_points(points, size, sums, n, first, places);
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
