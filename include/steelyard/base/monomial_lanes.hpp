// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>

#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>

// Sums of powers and products of one or two columns, on the eight virtual
// lanes of lanes.hpp: the same bits at every width.

#include <steelyard/base/widths_begin.hpp>

namespace steelyard::inline v1::detail {

STEELYARD_DETAIL_EACH_WIDTH(

/// lanes[8 k .. 8 k + 7] += w x^a y^b for each a + b <= Degree, k = (a+b)(a+b+1)/2 + b, over whole groups of eight;
/// with Vars = 1 for each a, k = a, and y is not looked at.
template <std::size_t Vars, std::size_t Degree>
inline void add_monomials(double const* x, double const* y, double const* weights, std::size_t groups, double* lanes) noexcept {
  for (std::size_t lane = 0; lane < 8; lane += width)
    for (std::size_t group = 0; group < groups; ++group) {
      vec of_x; load(x + 8 * group + lane, of_x);
      vec of_y; load(y + 8 * group + lane, of_y);
      vec row; load(weights + 8 * group + lane, row);
      for (std::size_t b = 0; b <= (Vars == 1 ? 0 : Degree); ++b) {
        vec term = row;
        for (std::size_t a = 0; a + b <= Degree; ++a) {
          double* const to = lanes + 8 * (Vars == 1 ? a : (a + b) * (a + b + 1) / 2 + b) + lane;
          vec sum; load(to, sum);
          add(sum, term, sum);
          store(sum, to);
          multiply(term, of_x, term);
        }
        multiply(row, of_y, row);
      }
    }
}

)  // STEELYARD_DETAIL_EACH_WIDTH

/// Sums of w x^a y^b over a + b <= Degree, as `add_monomials` orders them.
/// @param groups  how many eights there are; columns end in entries of weight 0 where they would not fill them
/// Cost  about 0.3 ns an entry and a sum with 512-bit vectors.
template <std::size_t Vars, std::size_t Degree>
void sum_monomials(double const* x, double const* y, double const* weights, std::size_t groups, double* lanes,
                   isa width = widest_isa()) noexcept {
#if defined(STEELYARD_DETAIL_AVX2)
  if (width == isa::avx512) return avx512::add_monomials<Vars, Degree>(x, y, weights, groups, lanes);
  if (width == isa::avx2) return avx2::add_monomials<Vars, Degree>(x, y, weights, groups, lanes);
  if (width == isa::sse2) return sse2::add_monomials<Vars, Degree>(x, y, weights, groups, lanes);
#endif
  static_cast<void>(width);
  plain::add_monomials<Vars, Degree>(x, y, weights, groups, lanes);
}

}  // namespace steelyard::inline v1::detail

#include <steelyard/base/widths_end.hpp>
