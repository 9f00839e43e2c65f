// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>

#include <steelyard/base/elementary.hpp>
#include <steelyard/base/normal.hpp>
#include <steelyard/instrument/log_sum.hpp>

// Logarithms of standard normal probabilities, good at any distance.
namespace steelyard::inline v1::detail {

inline constexpr double half_log_two_pi = 0.91893853320467274178;
inline constexpr double farthest_deviate = 1e150;  // its square is still finite

/// (x - mean) / sd, held where its square does not overflow.
inline double deviate(double x, double mean, double sd) noexcept {
  return std::clamp((x - mean) / sd, -farthest_deviate, farthest_deviate);
}

/// log of the standard normal density
inline double log_normal_density(double z) noexcept { return -0.5 * z * z - half_log_two_pi; }

/// log P(Z > z) + z^2 / 2 for z >= 0: what is left when the steep part is taken off.
///   From 12 on the asymptotic series: 15 terms reach 3e-17    [Abramowitz & Stegun 26.2.12]
inline double log_normal_mills(double z) noexcept {
  if (z < 12.0) return portable_log(normal_tail(z)) + 0.5 * z * z;
  double const step = 1.0 / (z * z);
  double term = 1.0, sum = 0.0;
  for (int k = 1; k <= 15; ++k) {
    term *= -static_cast<double>(2 * k - 1) * step;
    sum += term;
  }
  return portable_log1p(sum) - portable_log(z) - half_log_two_pi;
}

/// log P(Z > z)
inline double log_normal_above(double z) noexcept {
  if (z < 0.0) return portable_log1p(-normal_tail(-z));
  if (z < 12.0) return portable_log(normal_tail(z));
  return log_normal_mills(z) - 0.5 * z * z;
}

/// log P(|Z - m| <= h), h > 0. Narrow: Taylor series of the density about m in
/// Hermite polynomials. Wide: both ends in the same tail, taken apart as
/// Q(a) (1 - Q(b)/Q(a)) with the ratio from e^(-2 m h); or both tails from 1.
inline double log_normal_around(double m, double h) noexcept {
  m = std::abs(m);
  if (h * (m + h) < 0.3) {
    double const x = m * h, step = h * h;
    double before = 1.0, now = x, sum = 1.0, factorial = 1.0;  // now = h^n He_n(m)
    for (int n = 1; n < 21; ++n) {
      double const next = x * now - static_cast<double>(n) * step * before;
      before = now;
      now = next;
      factorial *= static_cast<double>(n + 1);
      if (n % 2 == 1) sum += now / (factorial * static_cast<double>(n + 2));
    }
    return portable_log(2.0 * h) + log_normal_density(m) + portable_log(sum);
  }
  double const a = m - h, b = m + h;
  if (a < 0.0) return portable_log1p(-(normal_tail(-a) + normal_tail(b)));
  double const near = log_normal_mills(a);
  double const ratio = b < farthest_deviate ? log_normal_mills(b) - near - 2.0 * m * h : impossible;
  return near - 0.5 * a * a + log_complement(ratio);
}

}  // namespace steelyard::inline v1::detail
