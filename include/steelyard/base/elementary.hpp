// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <limits>

#include <steelyard/base/bits.hpp>

// The library's own exponential and logarithm. A libm picks its code by
// processor; these give the same bits on every one and under every flag: each
// product and each sum is rounded on its own (base/bits.hpp). The polynomials
// are minimax fits made for this file (Remez exchange in 60-digit arithmetic).

namespace steelyard::inline v1::detail {

inline constexpr double log2_of_e = 0x1.71547652b82fep+0;
inline constexpr double ln2_high = 0x1.62e42fefa3000p-1;  // 41 bits: n * ln2_high is exact for |n| < 2^12
inline constexpr double ln2_low = 0x1.3de6af278ece6p-42;
inline constexpr double round_to_integer = 0x1.8p+52;  // x + this - this: x rounded to an integer
inline constexpr double largest_exponent = 0x1.62e42fefa39efp+9;  // log of the largest double

/// Coefficients of (e^r - 1 - r) / r^2 for |r| <= ln(2)/2, lowest first;
/// relative error of e^r: 3.7e-18.
inline constexpr double exp_coefficients[10] = {
    0x1.000000000000ap-1,  0x1.55555555554f9p-3,  0x1.5555555550846p-5,  0x1.1111111127e43p-7,  0x1.6c16c18438629p-10,
    0x1.a01a0129e5f3bp-13, 0x1.a01999e15bba4p-16, 0x1.71df25a7793f7p-19, 0x1.28ad9d8118031p-22, 0x1.ad7fce7eed14cp-26};

/// Coefficients of (2 artanh(s) - 2 s) / s^3 in s^2 for |s| <= 3 - sqrt(8),
/// lowest first; relative error of the logarithm: 1.3e-18.
inline constexpr double log_coefficients[7] = {
    0x1.5555555555593p-1, 0x1.999999997fc7dp-2, 0x1.249249420406dp-2, 0x1.c71c51f8e7912p-3,
    0x1.7466427fb7c3dp-3, 0x1.39a158cfb05e8p-3, 0x1.2f0970a6321bcp-3};

/// c[First] + c[First + Step] x + ... by Horner's rule, every step rounded on its own.
template <std::size_t First, std::size_t Step, std::size_t Terms>
inline double horner(double const (&c)[Terms], double x) noexcept {
  if constexpr (First + Step >= Terms)
    return c[First];
  else
    return plus(times(horner<First + Step, Step>(c, x), x), c[First]);
}

/// c[0] + c[1] x + ..., even and odd terms side by side.
template <std::size_t Terms>
inline double polynomial(double const (&c)[Terms], double x) noexcept {
  double const x2 = times(x, x);
  return plus(times(horner<1, 2>(c, x2), x), horner<0, 2>(c, x2));
}

/// The same for the exponential's ten terms, in pairs rather than one after
/// another: the order that base/lanes.hpp keeps too.
inline double exp_polynomial(double r, double r2) noexcept {
  double const(&c)[10] = exp_coefficients;
  auto const two_terms = [&](std::size_t k) { return plus(times(r, c[k + 1]), c[k]); };
  double const r4 = times(r2, r2);
  double const low = plus(two_terms(0), times(two_terms(2), r2));
  double const middle = plus(plus(two_terms(4), times(two_terms(6), r2)), times(two_terms(8), r4));
  return plus(low, times(middle, r4));
}

/// x = n ln 2 + r (+ rest), |r| <= ln(2)/2, and e^r = 1 + r + tail.
struct exp_reduction {
  std::int64_t n;
  double r;
  double rest;
  double tail;
};

inline exp_reduction reduce_exponent(double x) noexcept {
  double const shifted = plus(times(x, log2_of_e), round_to_integer);
  double const whole = minus(shifted, round_to_integer);
  double const near = minus(x, times(whole, ln2_high));  // exact
  double const step = times(whole, ln2_low);
  double const r = minus(near, step);
  double const r2 = times(r, r);
  return {static_cast<std::int64_t>(std::bit_cast<std::uint64_t>(shifted) -
                                    std::bit_cast<std::uint64_t>(round_to_integer)),
          r, minus(minus(near, r), step), times(exp_polynomial(r, r2), r2)};
}

/// e^x without libm: the same bits on every processor.
///   Under 1.1 units in the last place, subnormal results included. Above the
///   logarithm of the largest double the largest double (this library has no
///   infinities in its arithmetic); 0 where the result vanishes; NaN stays NaN.
/// Assumes  round to nearest. Where the processor flushes subnormal numbers
///          (as programs linked with -ffast-math ask it to), results below
///          2^-1022 are 0.
inline double portable_exp(double x) noexcept {
  if (x > largest_exponent) return std::numeric_limits<double>::max();
  if (x < -746.0) return 0.0;
  exp_reduction const e = reduce_exponent(x);
  double const p = plus(1.0, plus(e.r, e.tail));
  std::int64_t const half = e.n / 2;  // two exact steps reach 2^1024 and round once among the subnormals
  return times(times(p, power_of_two(half)), power_of_two(e.n - half));
}

/// e^x - 1 without libm, accurate near zero: under 1.5 units in the last
/// place. The largest double where e^x is out of range; NaN stays NaN.
inline double portable_expm1(double x) noexcept {
  if (x > 40.0) return minus(portable_exp(x), 1.0);
  if (x < -40.0) return -1.0;
  exp_reduction const e = reduce_exponent(x);
  double const tail = plus(e.tail, e.rest);
  if (e.n == 0) return plus(e.r, tail);
  double const scale = power_of_two(e.n);
  return plus(plus(minus(scale, 1.0), times(scale, e.r)), times(scale, tail));
}

/// x = 2^n (1 + f) with 1 + f in [sqrt(1/2), sqrt(2)), for x > 0.
struct log_reduction {
  double n;
  double f;
};

inline log_reduction reduce_for_log(double x) noexcept {
  std::uint64_t u = std::bit_cast<std::uint64_t>(x);
  std::int64_t n = 0;
  if (u < (std::uint64_t{1} << 52)) {  // subnormal: shift by integers, for processors that read it as zero
    int const shift = std::countl_zero(u) - 11;
    u <<= shift;  // the leading one lands on the lowest bit of the exponent
    n = -shift;
  }
  constexpr std::uint64_t root_half = 0x3fe6a09e667f3bcdu;
  std::int64_t const exponent = static_cast<std::int64_t>(u - root_half) >> 52;
  u -= static_cast<std::uint64_t>(exponent) << 52;
  return {static_cast<double>(n + exponent), minus(std::bit_cast<double>(u), 1.0)};
}

/// n ln 2 + log(1 + f) + correction.
inline double log_of_parts(double n, double f, double correction) noexcept {
  double const s = over(f, plus(2.0, f));
  double const z = times(s, s);
  double const bend = times(z, polynomial(log_coefficients, z));  // log(1 + f) = f - s (f - bend)
  double const low = plus(times(n, ln2_low), correction);
  return plus(times(n, ln2_high), minus(f, minus(times(s, minus(f, bend)), low)));
}

/// Natural logarithm without libm: the same bits on every processor.
///   Under 1.1 units in the last place, subnormal arguments included. Zero and
///   anything below give `lowest()`, since this library has no infinities in
///   its arithmetic; plus infinity and NaN come back as they are.
inline double portable_log(double x) noexcept {
  std::uint64_t const u = opaque_bits(x);
  if ((u & ~sign_bit) > infinity_bits || u == infinity_bits) return x;
  if (u == 0 || (u & sign_bit) != 0) return std::numeric_limits<double>::lowest();
  log_reduction const l = reduce_for_log(x);
  return log_of_parts(l.n, l.f, 0.0);
}

/// log(1 + x) without libm, accurate near zero: under 1.5 units in the last
/// place. -1 and anything below give `lowest()`; plus infinity and NaN come
/// back as they are.
inline double portable_log1p(double x) noexcept {
  if (!is_finite(x)) return is_minus_infinite(x) ? std::numeric_limits<double>::lowest() : x;
  if (x <= -1.0) return std::numeric_limits<double>::lowest();
  if (x > -0.29 && x < 0.41) return log_of_parts(0.0, x, 0.0);
  double const u = plus(1.0, x);
  double const lost = x >= 1.0 ? minus(1.0, minus(u, x)) : minus(x, minus(u, 1.0));
  log_reduction const l = reduce_for_log(u);
  return log_of_parts(l.n, l.f, over(lost, u));
}

/// Square root, rounded to nearest, without a call to libm.
/// @pre x >= 0
inline double portable_sqrt(double x) noexcept {
#if defined(__GNUC__) && defined(__x86_64__)
  double root;
  __asm__("sqrtsd {%1, %0|%0, %1}" : "=x"(root) : "x"(x));
  return root;
#elif defined(__GNUC__) && defined(__aarch64__)
  double root;
  __asm__("fsqrt %d0, %d1" : "=w"(root) : "w"(x));
  return root;
#else
  return fence(__builtin_sqrt(x));
#endif
}

}  // namespace steelyard::inline v1::detail
