// SPDX-License-Identifier: BSL-1.0
// No include guard on purpose: each header of kernels takes these names in and
// gives them back at its end with widths_end.hpp.
#if !defined(STEELYARD_PLAIN_KERNELS) && defined(__GNUC__) && defined(__x86_64__)
#define STEELYARD_DETAIL_INLINE inline __attribute__((always_inline))
#if defined(__clang__)
#define STEELYARD_DETAIL_AVX2 _Pragma("clang attribute push(__attribute__((target(\"avx2\"))), apply_to = function)")
#define STEELYARD_DETAIL_AVX512 \
  _Pragma("clang attribute push(__attribute__((target(\"avx512f\"))), apply_to = function)")
#define STEELYARD_DETAIL_POP _Pragma("clang attribute pop")
#else
#define STEELYARD_DETAIL_AVX2 _Pragma("GCC push_options") _Pragma("GCC target(\"avx2\")")
#define STEELYARD_DETAIL_AVX512 _Pragma("GCC push_options") _Pragma("GCC target(\"avx512f\")")
#define STEELYARD_DETAIL_POP _Pragma("GCC pop_options")
#endif
// The text between the brackets, once for every width.
#define STEELYARD_DETAIL_EACH_WIDTH(...)                                                             \
  namespace plain {                                                                                  \
  __VA_ARGS__                                                                                        \
  }                                                                                                  \
  namespace sse2 {                                                                                   \
  __VA_ARGS__                                                                                        \
  }                                                                                                  \
  STEELYARD_DETAIL_AVX2 namespace avx2 { __VA_ARGS__ }                                               \
  STEELYARD_DETAIL_POP STEELYARD_DETAIL_AVX512 namespace avx512 { __VA_ARGS__ }                      \
  STEELYARD_DETAIL_POP
#else
#define STEELYARD_DETAIL_INLINE inline
#define STEELYARD_DETAIL_EACH_WIDTH(...) \
  namespace plain {                      \
  __VA_ARGS__                            \
  }
#endif
