// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cstddef>

#include <steelyard/base/elementary.hpp>
#include <steelyard/base/lanes.hpp>

// Arithmetic on logarithms of probabilities, `impossible` being the logarithm
// of 0. No infinities, whatever the flags.
namespace steelyard::inline v1::detail {

/// log(p q)
inline double log_product(double log_p, double log_q) noexcept {
  if (!(log_p > impossible) || !(log_q > impossible)) return impossible;
  return std::max(log_p + std::max(log_q, 0.5 * impossible), impossible);
}

/// log(p + q)
inline double log_sum(double log_p, double log_q) noexcept {
  double const high = std::max(log_p, log_q), low = std::min(log_p, log_q);
  if (low < high - 750.0) return high;  // beyond the last digit; also where either is impossible
  return high + portable_log1p(portable_exp(low - high));
}

/// log(1 - p) for p <= 1
inline double log_complement(double log_p) noexcept {
  if (log_p >= 0.0) return impossible;
  if (log_p < -750.0) return 0.0;
  // the nearer of two forms that lose no digits [Maechler, Rmpfr vignette, 2012, from memory]
  return log_p > -0.69 ? portable_log(-portable_expm1(log_p)) : portable_log1p(-portable_exp(log_p));
}

/// log(p - q) for p >= q; as accurate as the gap between the two logarithms.
inline double log_difference(double log_p, double log_q) noexcept {
  if (log_q < log_p - 750.0) return log_p;  // also where q is 0
  return log_product(log_p, log_complement(log_q - log_p));
}

/// log(x / y), x, y > 0, with the digits of x - y where they are near
inline double log_ratio(double x, double y) noexcept {
  double const gap = (x - y) / y, ratio = x / y;
  if (gap > -0.29 && gap < 0.41) return portable_log1p(gap);
  return ratio > 1e-300 && ratio < 1e300 ? portable_log(ratio) : portable_log(x) - portable_log(y);
}

/// log of the integral of e^f from c - h to c + h, for a smooth f that changes
/// little on the way: Gauss-Legendre, 10 points, all terms positive.
/// @param log_density f
template <class F>
double log_integral(F const& log_density, double c, double h) {
  constexpr double node[5] = {0.14887433898163121, 0.43339539412924719, 0.67940956829902441, 0.86506336668898451,
                              0.97390652851717172};
  constexpr double weight[5] = {0.29552422471475287, 0.26926671930999636, 0.21908636251598204, 0.14945134915058059,
                                0.066671344308688138};
  double const middle = log_density(c);
  if (!(middle > impossible)) return impossible;
  double sum = 0.0;
  for (std::size_t k = 0; k < 5; ++k)
    sum += 0.5 * weight[k] *
           (portable_exp(log_density(c - h * node[k]) - middle) + portable_exp(log_density(c + h * node[k]) - middle));
  return middle + portable_log(2.0 * h) + portable_log(sum);
}

}  // namespace steelyard::inline v1::detail
