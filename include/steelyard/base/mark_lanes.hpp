// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>

// Numbers that stand where they begin to hold, spread over all places up to the next: whole numbers, so the same at
// every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

/// The mark of position i: the bits of the double 2^52 + i, since processors find the larger of two doubles faster than that
/// of two whole numbers.
inline constexpr std::uint64_t mark_of_first = 0x4330000000000000u;

namespace plain {
/// Each the largest of itself and those before it.
STEELYARD_DETAIL_INLINE void raise(vec&) noexcept {}
/// The last one everywhere.
STEELYARD_DETAIL_INLINE void last_of(vec const& v, vec& r) noexcept { r = v; }
/// Stores around the caches, where the processor can.
STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept { *to = v; }
}  // namespace plain

#if defined(STEELYARD_DETAIL_AVX2)
#if defined(__clang__)
#define STEELYARD_DETAIL_PAST(NAME)                                                    \
  STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept {   \
    __builtin_nontemporal_store(v, reinterpret_cast<uvec*>(to));                       \
  }
#else
#define STEELYARD_DETAIL_PAST(NAME)                                                    \
  STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept {   \
    typedef long long words __attribute__((vector_size(sizeof(uvec)), may_alias));     \
    __builtin_ia32_##NAME(reinterpret_cast<words*>(to), (words)v);                     \
  }
#endif
#define STEELYARD_DETAIL_RAISE(...)                                                    \
  {                                                                                    \
    vec const low = __builtin_shufflevector(vec{}, v, __VA_ARGS__);                    \
    v = low > v ? low : v;                                                             \
  }
namespace sse2 {
STEELYARD_DETAIL_INLINE void raise(vec& v) noexcept { STEELYARD_DETAIL_RAISE(0, 2) }
STEELYARD_DETAIL_INLINE void last_of(vec const& v, vec& r) noexcept { r = __builtin_shufflevector(v, v, 1, 1); }
STEELYARD_DETAIL_PAST(movntdq)
}  // namespace sse2
STEELYARD_DETAIL_AVX2 namespace avx2 {
STEELYARD_DETAIL_INLINE void raise(vec& v) noexcept {
  STEELYARD_DETAIL_RAISE(0, 4, 5, 6)
  STEELYARD_DETAIL_RAISE(0, 1, 4, 5)
}
STEELYARD_DETAIL_INLINE void last_of(vec const& v, vec& r) noexcept { r = __builtin_shufflevector(v, v, 3, 3, 3, 3); }
STEELYARD_DETAIL_PAST(movntdq256)
}
STEELYARD_DETAIL_POP STEELYARD_DETAIL_AVX512 namespace avx512 {
STEELYARD_DETAIL_INLINE void raise(vec& v) noexcept {
  STEELYARD_DETAIL_RAISE(0, 8, 9, 10, 11, 12, 13, 14)
  STEELYARD_DETAIL_RAISE(0, 1, 8, 9, 10, 11, 12, 13)
  STEELYARD_DETAIL_RAISE(0, 1, 2, 3, 8, 9, 10, 11)
}
STEELYARD_DETAIL_INLINE void last_of(vec const& v, vec& r) noexcept {
  r = __builtin_shufflevector(v, v, 7, 7, 7, 7, 7, 7, 7, 7);
}
STEELYARD_DETAIL_PAST(movntdq512)
}
STEELYARD_DETAIL_POP
#undef STEELYARD_DETAIL_PAST
#undef STEELYARD_DETAIL_RAISE
#endif

/// One place after another: see below.
inline std::uint64_t spread_each(std::uint64_t* marks, std::size_t n, std::uint64_t before, std::size_t* out) noexcept {
  for (std::size_t j = 0; j < n; ++j) {
    before = marks[j] > before ? marks[j] : before;
    marks[j] = 0;
    out[j] = before - mark_of_first;
  }
  return before;
}

STEELYARD_DETAIL_EACH_WIDTH(

/// out[j] = the position of the largest of `before` and marks[0 .. j]; marks become 0. Returns the last of these marks.
inline std::uint64_t spread_marks(std::uint64_t* marks, std::size_t n, std::uint64_t before, std::size_t* out,
                                  bool past_caches) noexcept {
  std::size_t const off = reinterpret_cast<std::uintptr_t>(out) / sizeof(std::size_t) % 8;
  std::size_t const head = off == 0 ? 0 : n < 8 - off ? n : 8 - off;
  before = spread_each(marks, head, before, out);
  uvec bits = uvec{} + before;
  vec top; __builtin_memcpy(&top, &bits, sizeof bits);
  vec const none = vec{};
  std::size_t j = head;
  for (; j + width <= n; j += width) {
    vec v; __builtin_memcpy(&v, marks + j, sizeof v);
    __builtin_memcpy(marks + j, &none, sizeof v);
    raise(v);
    vec last; last_of(v, last);
    v = top > v ? top : v;
    top = last > top ? last : top;
    __builtin_memcpy(&bits, &v, sizeof bits);
    bits = bits - mark_of_first;
    if (past_caches) {
      store_past(bits, out + j);
    } else {
      fetch_ahead<1>(out + j, 8192);
      __builtin_memcpy(out + j, &bits, sizeof bits);
    }
  }
  __builtin_memcpy(&before, &top, sizeof before);
  return spread_each(marks + j, n - j, before, out + j);
}

)  // STEELYARD_DETAIL_EACH_WIDTH

inline std::uint64_t spread_marks(isa width, std::uint64_t* marks, std::size_t n, std::uint64_t before, std::size_t* out,
                                  bool past_caches) noexcept {
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512) return avx512::spread_marks(marks, n, before, out, past_caches);
  if (width == isa::avx2) return avx2::spread_marks(marks, n, before, out, past_caches);
  if (width == isa::sse2) return sse2::spread_marks(marks, n, before, out, past_caches);
#endif
  static_cast<void>(width);
  return plain::spread_marks(marks, n, before, out, past_caches);
}

/// After stores around the caches, before anyone else may look.
inline void past_caches_done() noexcept {
#if defined(STEELYARD_DETAIL_AVX2)
  __builtin_ia32_sfence();
#endif
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
