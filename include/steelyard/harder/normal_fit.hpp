// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include <steelyard/base/elementary.hpp>

namespace steelyard::inline v1::detail {

/// A normal distribution fitted to points in k dimensions: mean and a lower
/// triangular factor of the covariance, or its diagonal alone where the points are few.
class normal_fit {
 public:
  normal_fit() = default;

  [[nodiscard]] std::size_t size() const noexcept { return mean_.size(); }
  [[nodiscard]] bool full() const noexcept { return !factor_.empty(); }
  [[nodiscard]] double mean(std::size_t i) const noexcept { return mean_[i]; }
  /// Standard deviation of coordinate i.
  [[nodiscard]] double deviation(std::size_t i) const noexcept { return deviation_[i]; }

  /// Weighted mean and covariance of points z(p) with weights w(p), shrunk for the number n they are worth:
  /// diagonal times 1 + 1/n, off-diagonals times n / (n + k); full where n > 3k.
  /// @param points  row p holds the k coordinates of point p
  static normal_fit of(std::span<double const> points, std::span<double const> weights, std::size_t k, double worth) {
    normal_fit fit;
    std::size_t const n = weights.size();
    double total = 0.0;
    for (double const w : weights) total += w;
    if (k == 0 || !(total > 0.0) || !(worth > 1.0)) return fit;
    fit.mean_.assign(k, 0.0);
    for (std::size_t p = 0; p < n; ++p)
      for (std::size_t i = 0; i < k; ++i) fit.mean_[i] += weights[p] / total * points[p * k + i];
    bool const full = worth > 3.0 * static_cast<double>(k);
    std::vector<double> covariance(full ? k * k : k, 0.0), d(k);
    for (std::size_t p = 0; p < n; ++p) {
      double const w = weights[p] / total;
      if (!(w > 0.0)) continue;
      for (std::size_t i = 0; i < k; ++i) d[i] = points[p * k + i] - fit.mean_[i];
      if (full) {
        for (std::size_t i = 0; i < k; ++i) {
          double const wi = w * d[i];
          double* const row = covariance.data() + i * k;
          for (std::size_t j = 0; j <= i; ++j) row[j] += wi * d[j];
        }
      } else {
        for (std::size_t i = 0; i < k; ++i) covariance[i] += w * d[i] * d[i];
      }
    }
    double const wider = 1.0 + 1.0 / worth, shrunk = worth / (worth + static_cast<double>(k));
    fit.deviation_.resize(k);
    for (std::size_t i = 0; i < k; ++i) {
      double& variance = covariance[full ? i * k + i : i];
      variance = variance * wider + 1e-12;
      fit.deviation_[i] = portable_sqrt(variance);
    }
    if (full) fit.factorise(covariance, k, shrunk);
    return fit;
  }

  /// x = mean + factor * e
  void place(std::span<double const> e, std::span<double> x) const noexcept {
    std::size_t const k = size();
    for (std::size_t i = 0; i < k; ++i) {
      double sum = 0.0;
      if (full())
        for (std::size_t j = 0; j <= i; ++j) sum += factor_[i * k + j] * e[j];
      else
        sum = deviation_[i] * e[i];
      x[i] = mean_[i] + sum;
    }
  }
  /// e with x = mean + factor * e; returns sum e^2.
  double standardise(std::span<double const> x, std::span<double> e) const noexcept {
    std::size_t const k = size();
    double squares = 0.0;
    for (std::size_t i = 0; i < k; ++i) {
      double sum = x[i] - mean_[i];
      if (full()) {
        for (std::size_t j = 0; j < i; ++j) sum -= factor_[i * k + j] * e[j];
        e[i] = sum / factor_[i * k + i];
      } else {
        e[i] = sum / deviation_[i];
      }
      squares += e[i] * e[i];
    }
    return squares;
  }

 private:
  /// Cholesky factor; the diagonal is kept alone where rounding leaves none.
  void factorise(std::vector<double> const& covariance, std::size_t k, double shrunk) {
    factor_.assign(k * k, 0.0);
    for (std::size_t i = 0; i < k; ++i)
      for (std::size_t j = 0; j <= i; ++j) {
        double sum = covariance[i * k + j] * (i == j ? 1.0 : shrunk);
        for (std::size_t l = 0; l < j; ++l) sum -= factor_[i * k + l] * factor_[j * k + l];
        if (i != j) {
          factor_[i * k + j] = sum / factor_[j * k + j];
        } else if (sum > 1e-10 * covariance[i * k + i]) {
          factor_[i * k + i] = portable_sqrt(sum);
        } else {
          factor_.clear();
          return;
        }
      }
  }

  std::vector<double> mean_, deviation_, factor_;
};

}  // namespace steelyard::inline v1::detail
