// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstdint>
#include <cstring>

namespace steelyard::inline v1::detail {

/// The 64 bits of a double, read in a way that no compiler folds away.
///   Under -ffast-math a compiler may assume that NaN and infinities do not
///   occur and drops every ordinary test for them, even one on the bits; it
///   can assume nothing about bits that come out of an empty asm.
/// Cost  one register move.
inline std::uint64_t opaque_bits(double const& x) noexcept {
  std::uint64_t u;
  std::memcpy(&u, &x, sizeof u);
#if defined(__GNUC__)
  __asm__("" : "+r"(u));
#else
  u = *const_cast<std::uint64_t const volatile*>(&u);
#endif
  return u;
}

inline constexpr std::uint64_t sign_bit = 0x8000000000000000u;
inline constexpr std::uint64_t infinity_bits = 0x7ff0000000000000u;

/// Not a number, whatever the compiler was told about NaN.
inline bool is_nan(double const& x) noexcept { return (opaque_bits(x) & ~sign_bit) > infinity_bits; }

/// Neither NaN nor infinite.
inline bool is_finite(double const& x) noexcept { return (opaque_bits(x) & ~sign_bit) < infinity_bits; }

inline bool is_plus_infinite(double const& x) noexcept { return opaque_bits(x) == infinity_bits; }

inline bool is_minus_infinite(double const& x) noexcept { return opaque_bits(x) == (infinity_bits | sign_bit); }

/// Hands `x` back as a value the optimiser knows nothing about: a product or
/// a sum behind a fence is rounded on its own, never contracted into a fused
/// multiply-add, reordered or cancelled, whatever the flags.
/// Cost  none beside the optimisations it forbids.
inline double fence(double x) noexcept {
#if defined(__GNUC__) && (defined(__x86_64__) || defined(__SSE2_MATH__))
  __asm__("" : "+x"(x));
  return x;
#elif defined(__GNUC__) && defined(__aarch64__)
  __asm__("" : "+w"(x));
  return x;
#else
  double volatile rounded = x;
  return rounded;
#endif
}

/// One rounding each: a * b, a + b, a - b, a / b with nothing fused.
inline double times(double a, double b) noexcept { return fence(a * b); }
inline double plus(double a, double b) noexcept { return fence(a + b); }
inline double minus(double a, double b) noexcept { return fence(a - b); }
inline double over(double a, double b) noexcept { return fence(a / fence(b)); }

/// 2^n for -1022 <= n <= 1023.
inline double power_of_two(std::int64_t n) noexcept {
  return std::bit_cast<double>((static_cast<std::uint64_t>(n) + 1023u) << 52);
}

/// Asks the processor for the memory so many bytes behind an address, soon to be read or written. It may lie past the end
/// of the array: nothing is touched, and the compiler sees no pointer into it.
/// @tparam Write  1 where it will be written    @tparam Near  from 3, as near as can be, down to 0
template <int Write = 0, int Near = 3>
inline void fetch_ahead(void const* from, std::uintptr_t bytes) noexcept {
#if defined(__GNUC__)
  std::uintptr_t address = reinterpret_cast<std::uintptr_t>(from) + bytes;
  __asm__("" : "+r"(address));
  __builtin_prefetch(reinterpret_cast<void const*>(address), Write, Near);
#else
  static_cast<void>(from);
  static_cast<void>(bytes);
#endif
}

}  // namespace steelyard::inline v1::detail
