// SPDX-License-Identifier: BSL-1.0
#pragma once

namespace steelyard::inline v1::detail {

/// The vector widths that kernels are written for. The choice changes speed
/// only: every width gives the same bits.
enum class isa {
  plain,  ///< one number at a time, any processor
  sse2,   ///< two; every x86-64
  avx2,   ///< four
  avx512  ///< eight
};

/// The widest that this processor and its operating system run. `plain` where
/// there are no vector kernels: off x86-64, on compilers without GCC's vector
/// types, and everywhere if the whole program defines STEELYARD_PLAIN_KERNELS.
/// Cost  a few nanoseconds.
inline isa widest_isa() noexcept {
#if !defined(STEELYARD_PLAIN_KERNELS) && defined(__GNUC__) && defined(__x86_64__)
  __builtin_cpu_init();
  if (__builtin_cpu_supports("avx512f")) return isa::avx512;
  if (__builtin_cpu_supports("avx2")) return isa::avx2;
  return isa::sse2;
#else
  return isa::plain;
#endif
}

}  // namespace steelyard::inline v1::detail
