// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>

#include <steelyard/base/isa.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/lanes.hpp>

// Sums that error bars need over a block of values and weights, on the eight
// virtual lanes of lanes.hpp: the same bits at every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

STEELYARD_DETAIL_EACH_WIDTH(

/// lanes[0..7] += w, [8..15] += w (f - first), for whole groups of eight.
inline void add_first(double const* values, double const* weights, double first, std::size_t groups,
                      double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec sum; load(lanes + lane, sum);
    vec firsts; load(lanes + 8 + lane, firsts);
    for (std::size_t group = 0; group < groups; ++group) {
      vec w; load(weights + 8 * group + lane, w);
      vec d; load(values + 8 * group + lane, d);
      add(sum, w, sum);
      subtract(d, first, d);
      multiply(d, w, d);
      add(firsts, d, firsts);
    }
    store(sum, lanes + lane);
    store(firsts, lanes + 8 + lane);
  }
}

/// With d = f - centre: lanes[0..7] += w^2, then in eights w^2 d, w^2 d^2, w^4, w^4 d, w^4 d^2, w^4 d^3, w^4 d^4.
inline void add_powers(double const* values, double const* weights, double centre, std::size_t groups,
                       double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec s0; load(lanes + lane, s0);
    vec s1; load(lanes + 8 + lane, s1);
    vec s2; load(lanes + 16 + lane, s2);
    vec f0; load(lanes + 24 + lane, f0);
    vec f1; load(lanes + 32 + lane, f1);
    vec f2; load(lanes + 40 + lane, f2);
    vec f3; load(lanes + 48 + lane, f3);
    vec f4; load(lanes + 56 + lane, f4);
    for (std::size_t group = 0; group < groups; ++group) {
      vec w; load(weights + 8 * group + lane, w);
      vec d; load(values + 8 * group + lane, d);
      subtract(d, centre, d);
      vec w2; multiply(w, w, w2);
      vec w4; multiply(w2, w2, w4);
      vec wd; multiply(w, d, wd);
      vec w2d; multiply(w, wd, w2d);
      vec w2d2; multiply(wd, wd, w2d2);
      add(s0, w2, s0);
      add(s1, w2d, s1);
      add(s2, w2d2, s2);
      add(f0, w4, f0);
      vec t; multiply(w2, w2d, t);
      add(f1, t, f1);
      multiply(w2, w2d2, t);
      add(f2, t, f2);
      multiply(w2d, w2d2, t);
      add(f3, t, f3);
      multiply(w2d2, w2d2, t);
      add(f4, t, f4);
    }
    store(s0, lanes + lane);
    store(s1, lanes + 8 + lane);
    store(s2, lanes + 16 + lane);
    store(f0, lanes + 24 + lane);
    store(f1, lanes + 32 + lane);
    store(f2, lanes + 40 + lane);
    store(f3, lanes + 48 + lane);
    store(f4, lanes + 56 + lane);
  }
}

/// Entries whose value is not 0 into w, w^2, w^4 (lanes in eights), the others into the next three.
inline void add_parted(double const* values, double const* weights, double, std::size_t groups, double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec i1; load(lanes + lane, i1);
    vec i2; load(lanes + 8 + lane, i2);
    vec i4; load(lanes + 16 + lane, i4);
    vec o1; load(lanes + 24 + lane, o1);
    vec o2; load(lanes + 32 + lane, o2);
    vec o4; load(lanes + 40 + lane, o4);
    vec const zero = vec{};
    for (std::size_t group = 0; group < groups; ++group) {
      vec w; load(weights + 8 * group + lane, w);
      vec f; load(values + 8 * group + lane, f);
      auto const in = f != zero;
      vec w2; multiply(w, w, w2);
      vec w4; multiply(w2, w2, w4);
      vec t; t = in ? w : zero;
      add(i1, t, i1);
      t = in ? w2 : zero;
      add(i2, t, i2);
      t = in ? w4 : zero;
      add(i4, t, i4);
      t = in ? zero : w;
      add(o1, t, o1);
      t = in ? zero : w2;
      add(o2, t, o2);
      t = in ? zero : w4;
      add(o4, t, o4);
    }
    store(i1, lanes + lane);
    store(i2, lanes + 8 + lane);
    store(i4, lanes + 16 + lane);
    store(o1, lanes + 24 + lane);
    store(o2, lanes + 32 + lane);
    store(o4, lanes + 40 + lane);
  }
}

/// With e = w - centre: lanes[0..7] += e, then in eights e^2, e^3, e^4. The values are not looked at.
inline void add_spread(double const*, double const* weights, double centre, std::size_t groups, double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width) {
    vec s1; load(lanes + lane, s1);
    vec s2; load(lanes + 8 + lane, s2);
    vec s3; load(lanes + 16 + lane, s3);
    vec s4; load(lanes + 24 + lane, s4);
    for (std::size_t group = 0; group < groups; ++group) {
      vec e; load(weights + 8 * group + lane, e);
      subtract(e, centre, e);
      vec e2; multiply(e, e, e2);
      vec t; multiply(e2, e, t);
      add(s1, e, s1);
      add(s2, e2, s2);
      add(s3, t, s3);
      multiply(e2, e2, t);
      add(s4, t, s4);
    }
    store(s1, lanes + lane);
    store(s2, lanes + 8 + lane);
    store(s3, lanes + 16 + lane);
    store(s4, lanes + 24 + lane);
  }
}

)  // STEELYARD_DETAIL_EACH_WIDTH

#if defined(STEELYARD_DETAIL_AVX2)
#define STEELYARD_DETAIL_CHOOSE(KERNEL)                                                         \
  if (width == isa::avx512) return avx512::KERNEL(values, weights, centre, groups, lanes);      \
  if (width == isa::avx2) return avx2::KERNEL(values, weights, centre, groups, lanes);          \
  if (width == isa::sse2) return sse2::KERNEL(values, weights, centre, groups, lanes);
#else
#define STEELYARD_DETAIL_CHOOSE(KERNEL) static_cast<void>(width);
#endif

/// One of the kernels above, by its place in this list.
enum class block_sums { first, powers, parted, spread };

template <block_sums Which>
void add_lanes(isa width, double const* values, double const* weights, double centre, std::size_t groups,
               double* lanes) noexcept {
  if constexpr (Which == block_sums::first) {
    STEELYARD_DETAIL_CHOOSE(add_first)
    plain::add_first(values, weights, centre, groups, lanes);
  } else if constexpr (Which == block_sums::powers) {
    STEELYARD_DETAIL_CHOOSE(add_powers)
    plain::add_powers(values, weights, centre, groups, lanes);
  } else if constexpr (Which == block_sums::parted) {
    STEELYARD_DETAIL_CHOOSE(add_parted)
    plain::add_parted(values, weights, centre, groups, lanes);
  } else {
    STEELYARD_DETAIL_CHOOSE(add_spread)
    plain::add_spread(values, weights, centre, groups, lanes);
  }
}

#undef STEELYARD_DETAIL_CHOOSE

/// The sums of one kernel over a block, lanes added up: `sums[k]` is its k-th
/// eight. A part group at the end is filled up with `idle` values and weights, which must add nothing.
/// Cost  about 1 ns an element for the powers with 512-bit vectors.
template <block_sums Which, std::size_t N>
void sum_block(std::span<double const> values, std::span<double const> weights, double centre, double idle_value,
               double idle_weight, double (&sums)[N], isa width = widest_isa()) noexcept {
  double lanes[N * virtual_lanes] = {};
  std::size_t const size = weights.size(), groups = size / virtual_lanes, rest = size % virtual_lanes;
  bool const looks = values.size() >= size;
  double const* const f = looks ? values.data() : weights.data();
  add_lanes<Which>(width, f, weights.data(), centre, groups, lanes);
  if (rest != 0) {
    double last_values[virtual_lanes], last_weights[virtual_lanes];
    for (std::size_t k = 0; k < virtual_lanes; ++k) {
      last_values[k] = k < rest ? f[groups * virtual_lanes + k] : idle_value;
      last_weights[k] = k < rest ? weights[groups * virtual_lanes + k] : idle_weight;
    }
    add_lanes<Which>(width, last_values, last_weights, centre, 1, lanes);
  }
  for (std::size_t k = 0; k < N; ++k) sums[k] = lane_total(lanes + k * virtual_lanes);
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
