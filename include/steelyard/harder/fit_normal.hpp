// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/harder/lower_triangle.hpp>
#include <steelyard/harder/normal_fit.hpp>

namespace steelyard::inline v1::detail {

/// The mean of weighted points, `total` being the sum of all weights.
inline std::vector<double> mean_of(weighted_points const (&points)[2], std::size_t k, double total) {
  std::vector<double> mean(k, 0.0);
  for (weighted_points const& part : points)
    for (std::size_t p = 0; p < part.weights.size(); ++p)
      for (std::size_t i = 0; i < k; ++i) mean[i] += part.weights[p] / total * part.rows[p * k + i];
  return mean;
}
/// sum w d d' / total about a mean; leaves the rows centred.
inline lower_triangle products_of(weighted_points& part, std::vector<double> const& mean, double total) {
  std::size_t const k = mean.size();
  lower_triangle sums(k);
  for (std::size_t p = 0; p < part.weights.size(); ++p) {
    double const w = part.weights[p] / total;
    double* const d = part.rows.data() + p * k;
    for (std::size_t i = 0; i < k; ++i) d[i] -= mean[i];
    for (std::size_t i = 0; i < k; ++i) {
      double const wd = w * d[i];
      double* const row = sums.row(i);
      for (std::size_t j = 0; j <= i; ++j) row[j] += wd * d[j];
    }
  }
  return sums;
}

/// Weighted mean and covariance of points in two parts, the covariance as a factor that holds thin directions to rounding.
struct sample_covariance {
  std::vector<double> mean;
  lower_triangle factor;    ///< L: the covariance is L L'
  lower_triangle parts[2];  ///< covariance of each part about the common mean, in units of L: L^-1 S_h L'^-1

  /// A thin direction is hidden by the rounding of its pivot, so points are standardised and their covariance is taken
  /// again until no pivot is small: Cholesky QR, as often as it takes    [Fukaya et al., SIAM J. Sci. Comput. 42, 2020]
  /// @param points  standardised on return
  /// Cost  n k^2 / 2 for n points each time
  static sample_covariance of(weighted_points (&points)[2], std::size_t k) {
    sample_covariance all{std::vector<double>(k, 0.0), lower_triangle(k), {}};
    double const totals[2] = {points[0].total(), points[1].total()}, total = totals[0] + totals[1];
    for (std::size_t i = 0; i < k; ++i) all.factor.row(i)[i] = 1.0;
    for (int pass = 0;; ++pass) {
      std::vector<double> const mean = mean_of(points, k, total);
      for (std::size_t i = 0; i < k; ++i)
        for (std::size_t j = 0; j <= i; ++j) all.mean[i] += all.factor.row(i)[j] * mean[j];
      lower_triangle units(k);
      for (std::size_t h = 0; h < 2; ++h) {
        all.parts[h] = products_of(points[h], mean, totals[h]);
        units.add(all.parts[h], totals[h] / total);
      }
      double const smallest = units.factorise(pass < 4 ? 1e-10 : 1e-14);
      all.factor = all.factor.times(units);
      if (smallest > 1e-6 || pass == 4) {
        for (lower_triangle& part : all.parts) part = units.whitened(part);
        return all;
      }
      for (weighted_points& part : points)
        for (std::size_t p = 0; p < part.weights.size(); ++p) {
          double* const x = part.rows.data() + p * k;
          for (std::size_t i = 0; i < k; ++i) {
            for (std::size_t j = 0; j < i; ++j) x[i] -= units.row(i)[j] * x[j];
            x[i] /= units.row(i)[i];
          }
        }
    }
  }

};

/// A Cholesky factor whose off-diagonals are shrunk to what n points can tell.
///   z_i = sum_j b_ij e_j + r_i regresses a word on the standardised innovations of those before it; b_ij has the
///   standard error r_i / sqrt(n), and becomes b_ij (1 - c r_i^2 / (n b_ij^2))_+; what it loses goes to r_i.
///                                        [Breiman, Technometrics 37, 1995: the non-negative garrote; Huang, Liu,
///                                         Pourahmadi & Liu, Biometrika 93, 2006: on Cholesky factors]
/// The error is relative to what the words before leave open, so a ridge stays as thin as it is, and noise in one
/// entry does not reach the others.
struct shrunk_factor {
  lower_triangle factor;   ///< G
  lower_triangle changed;  ///< L^-1 G

  /// @param c  0 keeps all; negative keeps none
  static shrunk_factor of(lower_triangle const& whole, double c, double n) {
    std::size_t const k = whole.size();
    shrunk_factor made{lower_triangle(k), lower_triangle(k)};
    std::vector<double> b(k), lost(k);
    for (std::size_t i = 0; i < k; ++i) {
      double const* const l = whole.row(i);
      double const before = static_cast<double>(i), open = l[i] * l[i] * n / std::max(1.0, n - before - 1.0);
      double kept = 0.0, square = 0.0;
      std::fill(b.begin(), b.end(), 0.0);
      for (std::size_t m = 0; m < i; ++m)
        for (std::size_t j = 0; j <= m; ++j) b[j] += l[m] * made.changed.row(m)[j];
      for (std::size_t j = 0; j < i; ++j) {
        double const strength = n * b[j] * b[j];
        double const share = c < 0.0 || !(strength > c * open) ? 0.0 : 1.0 - c * open / strength;
        made.factor.row(i)[j] = share * b[j];
        lost[j] = b[j] - share * b[j];
        kept += share > 0.0 ? 1.0 : 0.0;
      }
      for (std::size_t j = i; j-- > 0;) {  // lost, as a combination of the innovations of `whole`
        lost[j] /= made.changed.row(j)[j];
        for (std::size_t m = 0; m < j; ++m) lost[m] -= lost[j] * made.changed.row(j)[m];
        square += lost[j] * lost[j];
      }
      double const rest = portable_sqrt((l[i] * l[i] + square) * n / std::max(1.0, n - kept - 1.0));
      made.factor.row(i)[i] = rest;
      for (std::size_t j = 0; j < i; ++j) made.changed.row(i)[j] = (made.factor.row(i)[j] - b[j]) / l[i];
      made.changed.row(i)[i] = rest / l[i];
    }
    return made;
  }
};

/// Which shrinkage makes the fits of two parts foretell each other best, by the likelihood of the one under the fit of
/// the other. More is taken where less gains nothing.
inline double best_shrinkage(sample_covariance const& all, double const (&worth)[2]) {
  std::size_t const k = all.mean.size();
  lower_triangle roots[2] = {all.parts[0], all.parts[1]};
  for (lower_triangle& root : roots) root.factorise(1e-10);
  lower_triangle const wholes[2] = {all.factor.times(roots[0]), all.factor.times(roots[1])};
  lower_triangle const others[2] = {roots[0].solve(roots[1]), roots[1].solve(roots[0])};
  double best = -1.0, least = 0.0;
  for (double const c : {-1.0, 16.0, 4.0, 1.0, 0.0}) {
    double loss = 0.0;
    for (std::size_t h = 0; h < 2; ++h) {
      shrunk_factor const fit = shrunk_factor::of(wholes[h], c, worth[h]);
      for (std::size_t i = 0; i < k; ++i) loss += portable_log(fit.factor.row(i)[i] / all.factor.row(i)[i]);
      loss += 0.5 * fit.changed.solve(others[h]).sum_of_squares();
    }
    if (c < 0.0 || loss < least) {
      best = c;
      least = loss;
    }
  }
  return best;
}

/// The share of the correlations that two parts have in common; the rest is noise.
///   S / (S + (T - S)/2),   S = sum r_1 r_2,  T = sum (r_1^2 + r_2^2)/2   over the off-diagonals
inline double common_share(lower_triangle const (&parts)[2]) {
  double shared = 0.0, all = 0.0;
  for (std::size_t i = 0; i < parts[0].size(); ++i)
    for (std::size_t j = 0; j < i; ++j) {
      auto const correlation = [&](lower_triangle const& part) {
        double const unit = part.row(i)[i] * part.row(j)[j];
        return unit > 0.0 ? part.row(i)[j] / portable_sqrt(unit) : 0.0;
      };
      double const a = correlation(parts[0]), b = correlation(parts[1]);
      shared += a * b;
      all += 0.5 * (a * a + b * b);
    }
  return shared > 0.0 ? shared / (shared + 0.5 * std::max(0.0, all - shared)) : 0.0;
}

/// Fits a normal distribution to points in two parts that are independent of each other; none to a handful.
/// Where a part has fewer points than words, the covariance is taken as far as the two have correlations in common.
/// @param points  of no use afterwards
inline normal_fit fit_normal(weighted_points (&points)[2], std::size_t k) {
  double const worth[2] = {points[0].worth(), points[1].worth()}, n = worth[0] + worth[1];
  if (k == 0 || n < 8.0) return {};
  double const wider = 1.0 + 1.0 / n;  // for the mean's own error, in every direction alike
  if (std::min(worth[0], worth[1]) > static_cast<double>(k) + 8.0) {
    sample_covariance all = sample_covariance::of(points, k);
    lower_triangle factor = shrunk_factor::of(all.factor, best_shrinkage(all, worth), n).factor;
    factor.add(factor, portable_sqrt(wider) - 1.0);
    return {std::move(all.mean), factor};
  }
  double const totals[2] = {points[0].total(), points[1].total()}, total = totals[0] + totals[1];
  std::vector<double> mean = mean_of(points, k, total);
  lower_triangle const parts[2] = {products_of(points[0], mean, total), products_of(points[1], mean, total)};
  double const kept = n > static_cast<double>(k) ? common_share(parts) : 0.0;
  lower_triangle covariance = parts[0];
  covariance.add(parts[1], 1.0);
  for (std::size_t i = 0; i < k; ++i) {
    for (std::size_t j = 0; j < i; ++j) covariance.row(i)[j] *= kept;
    covariance.row(i)[i] *= wider;
  }
  covariance.factorise(1e-10);
  return {std::move(mean), covariance};
}

}  // namespace steelyard::inline v1::detail
