// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/harder/lower_triangle.hpp>

namespace steelyard::inline v1::detail {

/// Points in k dimensions with weights, row by row.
struct weighted_points {
  std::vector<double> rows, weights;

  [[nodiscard]] double total() const noexcept {
    double sum = 0.0;
    for (double const w : weights) sum += w;
    return sum;
  }
  /// How many points of equal weight tell as much: (sum w)^2 / sum w^2.
  [[nodiscard]] double worth() const noexcept {
    double sum = 0.0, squares = 0.0;
    for (double const w : weights) {
      sum += w;
      squares += w * w;
    }
    return squares > 0.0 ? sum * (sum / squares) : 0.0;
  }
};

/// A normal distribution fitted to weighted points: mean and a lower triangular factor of the covariance.
class normal_fit {
 public:
  normal_fit() = default;
  /// @param factor  L with covariance L L', on the diagonal above zero
  normal_fit(std::vector<double> mean, lower_triangle const& factor) : mean_(std::move(mean)) {
    std::size_t const k = size();
    bool diagonal = true;
    for (std::size_t i = 0; i < k; ++i) {
      double square = 0.0;
      for (std::size_t j = 0; j <= i; ++j) {
        square += factor.row(i)[j] * factor.row(i)[j];
        diagonal = diagonal && (j == i || factor.row(i)[j] == 0.0);
      }
      deviation_.push_back(portable_sqrt(square));
    }
    for (std::size_t j = 0; j < k && !diagonal; ++j)
      for (std::size_t i = j; i < k; ++i) factor_.push_back(factor.row(i)[j]);
    log_root_ = 0.0;
    for (std::size_t i = 0; i < k; ++i) log_root_ += portable_log(factor.row(i)[i]);
  }

  [[nodiscard]] std::size_t size() const noexcept { return mean_.size(); }
  [[nodiscard]] double deviation(std::size_t i) const noexcept { return deviation_[i]; }
  /// Logarithm of the square root of the covariance's determinant.
  [[nodiscard]] double log_root() const noexcept { return log_root_; }

  /// The law of mean + factor y for a y of another normal law.
  [[nodiscard]] normal_fit around(std::vector<double> const& inner_mean, lower_triangle const& inner) const {
    std::size_t const k = size();
    lower_triangle own(k);
    double const* column = factor_.data();
    for (std::size_t j = 0; j < k; ++j) {
      own.row(j)[j] = deviation_[j];
      if (factor_.empty()) continue;
      for (std::size_t i = j; i < k; ++i) own.row(i)[j] = column[i - j];
      column += k - j;
    }
    std::vector<double> mean(k);
    place(inner_mean, mean);
    return {std::move(mean), own.times(inner)};
  }

  /// x = mean + factor e
  void place(std::span<double const> e, std::span<double> x) const noexcept {
    std::size_t const k = size();
    for (std::size_t i = 0; i < k; ++i) x[i] = mean_[i] + (factor_.empty() ? deviation_[i] * e[i] : 0.0);
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
  std::vector<double> mean_, deviation_;
  std::vector<double> factor_;  // by columns from the diagonal down; empty: diagonal
  double log_root_ = 0.0;
};

}  // namespace steelyard::inline v1::detail
