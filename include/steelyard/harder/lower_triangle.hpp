// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>

namespace steelyard::inline v1::detail {

/// A lower triangular matrix, or the lower half of a symmetric one, row by row.
class lower_triangle {
 public:
  lower_triangle() = default;
  explicit lower_triangle(std::size_t k) : size_(k), entries_(k * (k + 1) / 2, 0.0) {}

  [[nodiscard]] std::size_t size() const noexcept { return size_; }
  [[nodiscard]] double* row(std::size_t i) noexcept { return entries_.data() + i * (i + 1) / 2; }
  [[nodiscard]] double const* row(std::size_t i) const noexcept { return entries_.data() + i * (i + 1) / 2; }

  lower_triangle& add(lower_triangle const& other, double factor) noexcept {
    for (std::size_t e = 0; e < entries_.size(); ++e) entries_[e] += factor * other.entries_[e];
    return *this;
  }

  /// Turns a symmetric matrix S into its Cholesky factor, S = L L'. A pivot below `least` of its diagonal, where rounding
  /// hides it, is taken to be that.
  /// @returns the smallest pivot as a share of its diagonal
  double factorise(double least) noexcept {
    double smallest = 1.0;
    for (std::size_t i = 0; i < size_; ++i) {
      double* const at = row(i);
      double const diagonal = at[i];
      double pivot = diagonal;
      for (std::size_t j = 0; j < i; ++j) {
        double const* const other = row(j);
        double sum = at[j];
        for (std::size_t m = 0; m < j; ++m) sum -= at[m] * other[m];
        at[j] = sum / other[j];
        pivot -= at[j] * at[j];
      }
      if (diagonal > 0.0) smallest = std::min(smallest, pivot / diagonal);
      at[i] = std::max(1e-18, portable_sqrt(std::max(pivot, least * diagonal)));
    }
    return smallest;
  }

  /// The product of two lower triangular matrices.
  [[nodiscard]] lower_triangle times(lower_triangle const& right) const {
    lower_triangle product(size_);
    for (std::size_t i = 0; i < size_; ++i)
      for (std::size_t m = 0; m <= i; ++m) {
        double const factor = row(i)[m];
        for (std::size_t j = 0; j <= m; ++j) product.row(i)[j] += factor * right.row(m)[j];
      }
    return product;
  }
  /// L^-1 right.
  [[nodiscard]] lower_triangle solve(lower_triangle right) const {
    for (std::size_t i = 0; i < size_; ++i) {
      double* const at = right.row(i);
      for (std::size_t m = 0; m < i; ++m)
        for (std::size_t j = 0; j <= m; ++j) at[j] -= row(i)[m] * right.row(m)[j];
      for (std::size_t j = 0; j <= i; ++j) at[j] /= row(i)[i];
    }
    return right;
  }
  /// L^-1 S L'^-1 for a symmetric S.
  [[nodiscard]] lower_triangle whitened(lower_triangle const& symmetric) const {
    std::vector<double> half(size_ * size_);  // L^-1 S
    for (std::size_t i = 0; i < size_; ++i) {
      double* const at = half.data() + i * size_;
      for (std::size_t j = 0; j < size_; ++j) at[j] = j <= i ? symmetric.row(i)[j] : symmetric.row(j)[i];
      for (std::size_t m = 0; m < i; ++m)
        for (std::size_t j = 0; j < size_; ++j) at[j] -= row(i)[m] * half[m * size_ + j];
      for (std::size_t j = 0; j < size_; ++j) at[j] /= row(i)[i];
    }
    lower_triangle all(size_);
    for (std::size_t i = 0; i < size_; ++i)
      for (std::size_t j = 0; j <= i; ++j) {
        double sum = half[i * size_ + j];
        for (std::size_t m = 0; m < j; ++m) sum -= row(j)[m] * all.row(i)[m];
        all.row(i)[j] = sum / row(j)[j];
      }
    return all;
  }
  [[nodiscard]] double sum_of_squares() const noexcept {
    double sum = 0.0;
    for (double const e : entries_) sum += e * e;
    return sum;
  }

 private:
  std::size_t size_ = 0;
  std::vector<double> entries_;
};

}  // namespace steelyard::inline v1::detail
