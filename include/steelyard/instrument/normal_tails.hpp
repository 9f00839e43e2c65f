// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>

#include <steelyard/base/elementary.hpp>
#include <steelyard/base/normal.hpp>
#include <steelyard/instrument/cell.hpp>
#include <steelyard/instrument/log_sum.hpp>

// Logarithms of standard normal probabilities, good at any distance.
namespace steelyard::inline v1::detail {

inline constexpr double half_log_two_pi = 0.91893853320467274178;
inline constexpr double farthest_square = 1e150;  // its square is still finite

/// (x - mean) / sd, held within what a double holds.
inline double deviate(double x, double mean, double sd) noexcept {
  return std::clamp(minus(x, mean) / sd, -1e300, 1e300);
}

/// z^2 / 2, held likewise.
inline double half_square(double z) noexcept {
  double const size = std::min(std::abs(z), farthest_square);
  return 0.5 * size * size;
}

/// A cell in standard deviations from the mean.
inline cell deviates(cell const& c, double mean, double sd) noexcept {
  cell const away = c.from(mean);
  auto const in_sd = [sd](double x) { return deviate(x, 0.0, sd); };
  return {in_sd(away.lower), in_sd(away.upper), in_sd(away.centre), in_sd(away.half), away.by_centre};
}

/// log of the standard normal density
inline double log_normal_density(double z) noexcept { return -half_square(z) - half_log_two_pi; }

/// log P(Z > z) + z^2 / 2 for z >= 0: what is left when the steep part is taken off.
///   From 12 on the asymptotic series: 15 terms reach 3e-17    [Abramowitz & Stegun 26.2.12]
inline double log_normal_mills(double z) noexcept {
  if (z < 12.0) return portable_log(normal_tail(z)) + half_square(z);
  double const step = 0.5 / half_square(z);
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
  return log_normal_mills(z) - half_square(z);
}

/// log P(c.lower < Z < c.upper). Narrow: Taylor series of the density about the
/// centre in Hermite polynomials. Wide: both ends in the same tail, taken apart as
/// Q(a) (1 - Q(b)/Q(a)) with the ratio from e^(-2 m h); or both tails from 1.
inline double log_normal_within(cell const& c) noexcept {
  double const m = std::abs(c.centre), h = c.half;
  if (h * (m + h) < 0.3) {
    double const x = m * h, step = h * h;
    double before = 1.0, now = x, sum = 1.0, factorial = 1.0;  // now = h^n He_n(m)
    for (int n = 1; n < 21; ++n) {
      double const next = x * now - static_cast<double>(n) * step * before;
      before = now;
      now = next;
      factorial *= static_cast<double>(n + 1);
      if (n % 2 == 1) sum += now / (factorial * static_cast<double>(n + 2));
      if (std::abs(now) + std::abs(before) < 1e-17 * factorial) break;
    }
    return portable_log(2.0 * h) + log_normal_density(m) + portable_log(sum);
  }
  if (c.lower < 0.0 && c.upper > 0.0) return portable_log1p(-(normal_tail(-c.lower) + normal_tail(c.upper)));
  double const a = std::min(std::abs(c.lower), std::abs(c.upper)), b = std::max(std::abs(c.lower), std::abs(c.upper));
  double const near = log_normal_mills(a);
  double const ratio = b < farthest_square ? log_normal_mills(b) - near - 2.0 * m * h : impossible;
  return near - half_square(a) + log_complement(ratio);
}

}  // namespace steelyard::inline v1::detail
