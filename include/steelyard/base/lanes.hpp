// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <limits>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>

// The kernels' inner loops, for one, two, four and eight numbers at a time.
//
// All widths run the same text on eight virtual lanes: element i of a block
// belongs to lane i mod 8, and a width that holds fewer walks over the block
// several times. Every product and every sum is held behind a fence, so each
// lane sees the same rounded operations in the same order whatever the width
// and the flags. Vectors are GCC's and Clang's own types, used inside functions
// compiled for their instruction set and never passed by value.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

inline constexpr std::size_t virtual_lanes = 8;
inline constexpr double impossible = std::numeric_limits<double>::lowest();

namespace plain {
using vec = double;
using uvec = std::uint64_t;
STEELYARD_DETAIL_INLINE void hold(vec& v) noexcept { v = fence(v); }
}  // namespace plain

#if defined(STEELYARD_DETAIL_AVX2)
#define STEELYARD_DETAIL_VECTORS(BYTES)                           \
  typedef double vec __attribute__((vector_size(BYTES)));         \
  typedef std::uint64_t uvec __attribute__((vector_size(BYTES))); \
  STEELYARD_DETAIL_INLINE void hold(vec& v) noexcept {            \
    __asm__("" : "+v"(v));                                        \
  }
namespace sse2 {
STEELYARD_DETAIL_VECTORS(16)
}
STEELYARD_DETAIL_AVX2 namespace avx2 { STEELYARD_DETAIL_VECTORS(32) }
STEELYARD_DETAIL_POP STEELYARD_DETAIL_AVX512 namespace avx512 { STEELYARD_DETAIL_VECTORS(64) }
STEELYARD_DETAIL_POP
#undef STEELYARD_DETAIL_VECTORS
#endif

STEELYARD_DETAIL_EACH_WIDTH(

inline constexpr std::size_t width = sizeof(vec) / sizeof(double);

STEELYARD_DETAIL_INLINE void load(double const* from, vec& v) noexcept { __builtin_memcpy(&v, from, sizeof v); }
STEELYARD_DETAIL_INLINE void store(vec const& v, double* to) noexcept { __builtin_memcpy(to, &v, sizeof v); }
/// Two vectors worked on side by side, so that one's arithmetic fills the
/// other's waits.
struct pair {
  vec a;
  vec b;
};

/// One rounding each.
template <class Other>
STEELYARD_DETAIL_INLINE void multiply(vec const& x, Other const& y, vec& r) noexcept { r = x * y; hold(r); }
template <class Other>
STEELYARD_DETAIL_INLINE void add(vec const& x, Other const& y, vec& r) noexcept { r = x + y; hold(r); }
template <class Other>
STEELYARD_DETAIL_INLINE void subtract(vec const& x, Other const& y, vec& r) noexcept { r = x - y; hold(r); }

STEELYARD_DETAIL_INLINE void multiply(pair const& x, pair const& y, pair& r) noexcept {
  multiply(x.a, y.a, r.a);
  multiply(x.b, y.b, r.b);
}
STEELYARD_DETAIL_INLINE void multiply(pair const& x, double y, pair& r) noexcept {
  multiply(x.a, y, r.a);
  multiply(x.b, y, r.b);
}
STEELYARD_DETAIL_INLINE void add(pair const& x, pair const& y, pair& r) noexcept {
  add(x.a, y.a, r.a);
  add(x.b, y.b, r.b);
}
STEELYARD_DETAIL_INLINE void add(pair const& x, double y, pair& r) noexcept {
  add(x.a, y, r.a);
  add(x.b, y, r.b);
}
STEELYARD_DETAIL_INLINE void subtract(pair const& x, pair const& y, pair& r) noexcept {
  subtract(x.a, y.a, r.a);
  subtract(x.b, y.b, r.b);
}
STEELYARD_DETAIL_INLINE void subtract(pair const& x, double y, pair& r) noexcept {
  subtract(x.a, y, r.a);
  subtract(x.b, y, r.b);
}

/// r = low + high * x
STEELYARD_DETAIL_INLINE void combine(pair const& low, pair const& high, pair const& x, pair& r) noexcept {
  pair product; multiply(high, x, product);
  add(low, product, r);
}

/// c[k] + c[k + 1] x
STEELYARD_DETAIL_INLINE void two_terms(std::size_t k, pair const& x, pair& r) noexcept {
  multiply(x, exp_coefficients[k + 1], r);
  add(r, exp_coefficients[k], r);
}

/// p 2^n, n in the low bits of `shifted` and 200 too large there, so that the
/// last product alone may round, among the subnormals.
STEELYARD_DETAIL_INLINE void scale(vec const& p, vec const& shifted, vec& r) noexcept {
  uvec bits; __builtin_memcpy(&bits, &p, sizeof p);
  uvec power; __builtin_memcpy(&power, &shifted, sizeof p);
  bits = bits + (power << 52);
  __builtin_memcpy(&r, &bits, sizeof p);
  multiply(r, 0x1p-200, r);
}

/// e^d for -745.2 <= d <= 0: the operations of portable_exp, so the same bits.
STEELYARD_DETAIL_INLINE void exponential(pair const& d, pair& result) noexcept {
  pair shifted; multiply(d, log2_of_e, shifted);
  add(shifted, round_to_integer + 200.0, shifted);
  pair whole; subtract(shifted, round_to_integer + 200.0, whole);
  pair product; multiply(whole, ln2_high, product);
  pair r; subtract(d, product, r);
  multiply(whole, ln2_low, product);
  subtract(r, product, r);
  pair r2; multiply(r, r, r2);
  pair r4; multiply(r2, r2, r4);
  pair low; two_terms(0, r, low);
  pair high; two_terms(2, r, high);
  combine(low, high, r2, low);
  pair middle; two_terms(4, r, middle);
  two_terms(6, r, high);
  combine(middle, high, r2, middle);
  two_terms(8, r, high);
  combine(middle, high, r4, middle);
  combine(low, middle, r4, low);
  combine(r, low, r2, r);
  add(r, 1.0, r);
  scale(r.a, shifted.a, result.a);
  scale(r.b, shifted.b, result.b);
}

/// Weights and their sums: lanes[0..7] += w, [8..15] += w^2, [16..23] += w (log - maximum),
/// w = e^(log - maximum), for whole groups of eight.
inline void add_weights(double const* logs, double maximum, double* weights, std::size_t groups,
                        double* lanes) noexcept {
  double const none[8] = {impossible, impossible, impossible, impossible,
                          impossible, impossible, impossible, impossible};
  double scrap[8];
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec sum; load(lanes + lane, sum);
    vec squares; load(lanes + 8 + lane, squares);
    vec products; load(lanes + 16 + lane, products);
    vec const zero = vec{};
    vec const vanishing = zero - 745.2;  // e^d rounds to 0 there, and d may be out of range
    for (std::size_t group = 0; group < groups; group += 2) {
      bool const alone = group + 1 == groups;
      pair d; load(logs + 8 * group + lane, d.a);
      load((alone ? none : logs + 8 * group + 8) + lane, d.b);
      subtract(d, maximum, d);
      auto const alive_a = d.a > vanishing;
      auto const alive_b = d.b > vanishing;
      d.a = alive_a ? d.a : zero;
      d.b = alive_b ? d.b : zero;
      pair w; exponential(d, w);
      w.a = alive_a ? w.a : zero;
      w.b = alive_b ? w.b : zero;
      store(w.a, weights + 8 * group + lane);
      store(w.b, (alone ? scrap : weights + 8 * group + 8) + lane);
      add(sum, w.a, sum);
      add(sum, w.b, sum);
      multiply(d, w, d);
      add(products, d.a, products);
      add(products, d.b, products);
      multiply(w, w, w);
      add(squares, w.a, squares);
      add(squares, w.b, squares);
    }
    store(sum, lanes + lane);
    store(squares, lanes + 8 + lane);
    store(products, lanes + 16 + lane);
  }
}

/// lanes[0..7] += v, for whole groups of eight.
inline void add_values(double const* values, std::size_t groups, double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec sum; load(lanes + lane, sum);
    for (std::size_t group = 0; group < groups; ++group) {
      if (lane == 0) fetch_ahead<0, 2>(values + 8 * group, 16384);  // processors stop at the end of a page
      vec v; load(values + 8 * group + lane, v);
      add(sum, v, sum);
    }
    store(sum, lanes + lane);
  }
}

/// flags[0..7] gets its sign bit where a value of its lane is infinite or not a number, in whole groups of eight.
inline void flag_not_finite(double const* values, std::size_t groups, std::uint64_t* flags) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    uvec any; __builtin_memcpy(&any, flags + lane, sizeof any);
    for (std::size_t group = 0; group < groups; ++group) {
      uvec bits; __builtin_memcpy(&bits, values + 8 * group + lane, sizeof bits);
      any = any | ((bits & ~sign_bit) + 0x0010000000000000u);
    }
    __builtin_memcpy(flags + lane, &any, sizeof any);
  }
}

/// Raises lanes[0..7] to the largest of their elements in whole groups of eight.
inline void raise_maximum(double const* values, std::size_t groups, double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec top; load(lanes + lane, top);
    for (std::size_t group = 0; group < groups; ++group) {
      vec v; load(values + 8 * group + lane, v);
      top = v > top ? v : top;
    }
    store(top, lanes + lane);
  }
}

)  // STEELYARD_DETAIL_EACH_WIDTH

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
