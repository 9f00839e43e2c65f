// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>

namespace steelyard::inline v1::detail {

/// Points in k dimensions with weights, row by row.
struct weighted_points {
  std::vector<double> rows, weights;
};

/// A normal distribution fitted to weighted points: mean and a lower triangular factor of the covariance, or its
/// diagonal alone where nothing more can be told from noise.
class normal_fit {
 public:
  normal_fit() = default;

  [[nodiscard]] std::size_t size() const noexcept { return mean_.size(); }
  [[nodiscard]] double deviation(std::size_t i) const noexcept { return deviation_[i]; }

  /// Fits to points in two parts that are independent of each other. What their correlations share is signal, the
  /// rest is noise, so off-diagonals are shrunk by
  ///   S / (S + (T - S)/2),   S = sum r_1 r_2,  T = sum (r_1^2 + r_2^2)/2   over the off-diagonals
  /// and left out where that is zero or the points are fewer than k.
  /// Cost  n k^2 for n points.
  static normal_fit of(weighted_points const (&parts)[2], std::size_t k) {
    normal_fit fit;
    double part_total[2] = {0.0, 0.0}, squares = 0.0;
    for (std::size_t h = 0; h < 2; ++h)
      for (double const w : parts[h].weights) {
        part_total[h] += w;
        squares += w * w;
      }
    double const total = part_total[0] + part_total[1], worth = squares > 0.0 ? total * (total / squares) : 0.0;
    if (k == 0 || worth < 8.0) return fit;
    fit.mean_.assign(k, 0.0);
    for (auto const& part : parts)
      for (std::size_t p = 0; p < part.weights.size(); ++p)
        for (std::size_t i = 0; i < k; ++i) fit.mean_[i] += part.weights[p] / total * part.rows[p * k + i];
    bool const full = worth > static_cast<double>(k) && part_total[0] > 0.0 && part_total[1] > 0.0;
    std::vector<double> products[2];
    for (std::size_t h = 0; h < 2; ++h) products[h] = fit.products_of(parts[h], total, full);
    double const shrunk = full ? signal(products, k, total / part_total[0], total / part_total[1]) : 0.0;
    for (std::size_t i = 0; i < products[0].size(); ++i) products[0][i] += products[1][i];
    fit.deviation_.resize(k);
    for (std::size_t i = 0; i < k; ++i) {
      double& variance = products[0][full ? i * k + i : i];
      variance = variance * (1.0 + 1.0 / worth) + 1e-36;
      fit.deviation_[i] = portable_sqrt(variance);
    }
    if (shrunk > 0.0) fit.factorise(products[0], shrunk);
    return fit;
  }

  /// x = mean + factor e
  void place(std::span<double const> e, std::span<double> x) const noexcept {
    std::size_t const k = size();
    for (std::size_t i = 0; i < k; ++i) x[i] = mean_[i] + deviation_[i] * (factor_.empty() ? e[i] : 0.0);
    double const* column = factor_.data();
    for (std::size_t j = 0; j < k && !factor_.empty(); column += k - j++)
      for (std::size_t i = j; i < k; ++i) x[i] += column[i - j] * e[j];
  }
  /// e with x = mean + factor e; returns sum e^2.
  double standardise(std::span<double const> x, std::span<double> e) const noexcept {
    std::size_t const k = size();
    double squares = 0.0;
    for (std::size_t i = 0; i < k; ++i) e[i] = x[i] - mean_[i];
    double const* column = factor_.data();
    for (std::size_t j = 0; j < k; ++j) {
      if (factor_.empty()) {
        e[j] /= deviation_[j];
      } else {
        double const here = e[j] /= column[0];
        for (std::size_t i = j + 1; i < k; ++i) e[i] -= column[i - j] * here;
        column += k - j;
      }
      squares += e[j] * e[j];
    }
    return squares;
  }

 private:
  /// sum w d d' / total about the mean, lower triangle row by row with k to a row; the diagonal alone unless `full`.
  [[nodiscard]] std::vector<double> products_of(weighted_points const& part, double total, bool full) const {
    std::size_t const k = size();
    std::vector<double> sums(full ? k * k : k, 0.0), d(k);
    for (std::size_t p = 0; p < part.weights.size(); ++p) {
      double const w = part.weights[p] / total;
      for (std::size_t i = 0; i < k; ++i) d[i] = part.rows[p * k + i] - mean_[i];
      for (std::size_t i = 0; i < k; ++i) {
        double const wd = w * d[i];
        if (!full) {
          sums[i] += wd * d[i];
          continue;
        }
        double* const row = sums.data() + i * k;
        for (std::size_t j = 0; j <= i; ++j) row[j] += wd * d[j];
      }
    }
    return sums;
  }
  /// The share of signal in the off-diagonals of the two parts together, in [0, 1].
  static double signal(std::vector<double> const (&products)[2], std::size_t k, double scale_0, double scale_1) {
    double shared = 0.0, all = 0.0;
    for (std::size_t i = 0; i < k; ++i)
      for (std::size_t j = 0; j < i; ++j) {
        double const unit = (products[0][i * k + i] + products[1][i * k + i]) * (products[0][j * k + j] + products[1][j * k + j]);
        if (!(unit > 0.0)) continue;
        double const a = scale_0 * products[0][i * k + j], b = scale_1 * products[1][i * k + j];
        shared += a * b / unit;
        all += 0.5 * (a * a + b * b) / unit;
      }
    return shared > 0.0 ? shared / (shared + 0.5 * std::max(0.0, all - shared)) : 0.0;
  }
  /// Cholesky factor, column by column from the diagonal down; none where rounding leaves none, and the diagonal serves.
  void factorise(std::vector<double> const& covariance, double shrunk) {
    std::size_t const k = size();
    for (std::size_t j = 0; j < k; ++j)
      for (std::size_t i = j; i < k; ++i) factor_.push_back(covariance[i * k + j] * (i == j ? 1.0 : shrunk));
    double* column = factor_.data();
    for (std::size_t j = 0; j < k; ++j) {
      if (!(column[0] > 1e-10 * covariance[j * k + j])) return factor_.clear();
      double const root = portable_sqrt(column[0]);
      for (std::size_t i = 0; i < k - j; ++i) column[i] /= root;
      double* other = column + (k - j);
      for (std::size_t l = j + 1; l < k; other += k - l++)
        for (std::size_t i = l; i < k; ++i) other[i - l] -= column[i - j] * column[l - j];
      column += k - j;
    }
  }

  std::vector<double> mean_, deviation_;
  std::vector<double> factor_;  // empty: diagonal
};

}  // namespace steelyard::inline v1::detail
