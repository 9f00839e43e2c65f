// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>

#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>

// Numbers that stand where they begin to hold, spread over all places up to the next: whole numbers, so the same at
// every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

namespace plain {
STEELYARD_DETAIL_INLINE void larger(uvec& v, uvec const& other) noexcept { v = v > other ? v : other; }
/// Each the largest of itself and those before it.
STEELYARD_DETAIL_INLINE void raise(uvec&) noexcept {}
/// The last one everywhere.
STEELYARD_DETAIL_INLINE void last_of(uvec const& v, uvec& r) noexcept { r = v; }
/// Stores around the caches, where the processor can.
STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept { *to = v; }
}  // namespace plain

#if defined(STEELYARD_DETAIL_AVX2)
#if defined(__clang__)
#define STEELYARD_DETAIL_PAST(NAME)                                                           \
  STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept {        \
    __builtin_nontemporal_store(v, reinterpret_cast<uvec*>(to));                              \
  }
#else
#define STEELYARD_DETAIL_PAST(NAME)                                                           \
  STEELYARD_DETAIL_INLINE void store_past(uvec const& v, std::size_t* to) noexcept {        \
    typedef long long words __attribute__((vector_size(sizeof(uvec)), may_alias));            \
    __builtin_ia32_##NAME(reinterpret_cast<words*>(to), (words)v);                            \
  }
#endif
namespace sse2 {
STEELYARD_DETAIL_INLINE void larger(uvec& v, uvec const& other) noexcept { v = v > other ? v : other; }
STEELYARD_DETAIL_INLINE void raise(uvec& v) noexcept { larger(v, __builtin_shufflevector(uvec{}, v, 0, 2)); }
STEELYARD_DETAIL_INLINE void last_of(uvec const& v, uvec& r) noexcept { r = __builtin_shufflevector(v, v, 1, 1); }
STEELYARD_DETAIL_PAST(movntdq)
}  // namespace sse2
STEELYARD_DETAIL_AVX2 namespace avx2 {
STEELYARD_DETAIL_INLINE void larger(uvec& v, uvec const& other) noexcept {
  typedef long long signs __attribute__((vector_size(32)));
  v = (signs)v > (signs)other ? v : other;
}
STEELYARD_DETAIL_INLINE void raise(uvec& v) noexcept {
  larger(v, __builtin_shufflevector(uvec{}, v, 0, 4, 5, 6));
  larger(v, __builtin_shufflevector(uvec{}, v, 0, 1, 4, 5));
}
STEELYARD_DETAIL_INLINE void last_of(uvec const& v, uvec& r) noexcept { r = __builtin_shufflevector(v, v, 3, 3, 3, 3); }
STEELYARD_DETAIL_PAST(movntdq256)
}
STEELYARD_DETAIL_POP STEELYARD_DETAIL_AVX512 namespace avx512 {
STEELYARD_DETAIL_INLINE void larger(uvec& v, uvec const& other) noexcept { v = v > other ? v : other; }
STEELYARD_DETAIL_INLINE void raise(uvec& v) noexcept {
  larger(v, __builtin_shufflevector(uvec{}, v, 0, 8, 9, 10, 11, 12, 13, 14));
  larger(v, __builtin_shufflevector(uvec{}, v, 0, 1, 8, 9, 10, 11, 12, 13));
  larger(v, __builtin_shufflevector(uvec{}, v, 0, 1, 2, 3, 8, 9, 10, 11));
}
STEELYARD_DETAIL_INLINE void last_of(uvec const& v, uvec& r) noexcept {
  r = __builtin_shufflevector(v, v, 7, 7, 7, 7, 7, 7, 7, 7);
}
STEELYARD_DETAIL_PAST(movntdq512)
}
STEELYARD_DETAIL_POP
#undef STEELYARD_DETAIL_PAST
#endif

STEELYARD_DETAIL_EACH_WIDTH(

/// out[j] = the largest of `before` and marks[0 .. j]; marks become 0. Returns the last of out, or `before`.
inline std::uint64_t spread_marks(std::uint64_t* marks, std::size_t n, std::uint64_t before, std::size_t* out,
                                  bool past_caches) noexcept {
  std::size_t j = 0;
  for (; j < n && reinterpret_cast<std::uintptr_t>(out + j) % 64 != 0; ++j) {
    before = marks[j] > before ? marks[j] : before;
    marks[j] = 0;
    out[j] = before;
  }
  uvec top = uvec{} + before;
  uvec const none = uvec{};
  for (; j + width <= n; j += width) {
    uvec v; __builtin_memcpy(&v, marks + j, sizeof v);
    __builtin_memcpy(marks + j, &none, sizeof v);
    raise(v);
    uvec last; last_of(v, last);
    larger(v, top);
    larger(top, last);
    if (past_caches) {
      store_past(v, out + j);
    } else {
      __builtin_prefetch(out + j + 1024, 1);
      __builtin_memcpy(out + j, &v, sizeof v);
    }
  }
  __builtin_memcpy(&before, &top, sizeof before);
  for (; j < n; ++j) {
    before = marks[j] > before ? marks[j] : before;
    marks[j] = 0;
    out[j] = before;
  }
  return before;
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
