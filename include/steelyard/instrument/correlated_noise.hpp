// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <limits>
#include <string>
#include <string_view>

#include <steelyard/base/error.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/instrument/checks.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

/// Made by `correlated_noise`.
template <std::size_t N>
class correlated_instrument {
  static_assert(N > 0, "steelyard: correlated_noise needs at least one reading");

 public:
  using truth_type = std::array<double, N>;
  using matrix = std::array<std::array<double, N>, N>;

  explicit correlated_instrument(matrix const& covariance) { factorise(covariance); }

  [[nodiscard]] std::string_view name() const noexcept { return "correlated_noise"; }
  /// The smallest standard deviation of one of the readings.
  [[nodiscard]] double scale() const { return scale_; }
  /// The covariance matrix, as the factor gives it back.
  [[nodiscard]] matrix covariance() const {
    matrix product{};
    for (std::size_t i = 0; i < N; ++i)
      for (std::size_t j = 0; j < N; ++j)
        for (std::size_t k = 0; k <= i && k <= j; ++k) product[i][j] += factor_[i][k] * factor_[j][k];
    return product;
  }

  /// @throws bad_argument where a reading is not a finite number
  void check(std::array<double, N> const& reading) const {
    for (std::size_t i = 0; i < N; ++i)
      if (!detail::is_finite(reading[i]))
        throw bad_argument("correlated_noise: reading " + std::to_string(i) + " is " +
                           detail::plain_number(reading[i]) + "; it must be a finite number");
  }

  /// Log-density of all readings together, by forward substitution.
  /// @throws bad_argument, bad_readout where a number is not finite
  /// Cost  N^2 / 2 multiplications and additions.
  log_likelihood score(std::array<double, N> const& reading, std::array<double, N> const& truth) const {
    check(reading);
    double sum = log_constant_;
    std::array<double, N> solved;
    for (std::size_t i = 0; i < N; ++i) {
      double rest = reading[i] - detail::finite_truth(name(), truth[i]);
      for (std::size_t j = 0; j < i; ++j) rest -= factor_[i][j] * solved[j];
      solved[i] = detail::deviate(rest, 0.0, factor_[i][i]);
      sum -= detail::half_square(solved[i]);
    }
    return log_likelihood{sum};
  }

  std::array<double, N> draw(std::array<double, N> const& truth, draws& d) const {
    std::array<double, N> fake{}, noise{};
    for (std::size_t i = 0; i < N; ++i) {
      noise[i] = d.normal();
      fake[i] = detail::finite_truth(name(), truth[i]);
      for (std::size_t j = 0; j <= i; ++j) fake[i] += factor_[i][j] * noise[j];
    }
    return fake;
  }

 private:
  /// Lower triangle L with L L^T = covariance (Cholesky), once.
  void factorise(matrix const& covariance) {
    log_constant_ = -static_cast<double>(N) * detail::half_log_two_pi;
    double smallest = std::numeric_limits<double>::max();
    for (std::size_t i = 0; i < N; ++i) {
      double const variance = detail::positive("correlated_noise", "a variance", covariance[i][i]);
      smallest = variance < smallest ? variance : smallest;
      for (std::size_t j = 0; j <= i; ++j) {
        double const gap = covariance[i][j] - covariance[j][i];
        double const size = detail::portable_sqrt(variance) * detail::portable_sqrt(covariance[j][j]);
        if (!detail::is_finite(gap) || gap > 1e-12 * size || -gap > 1e-12 * size)
          throw bad_argument("correlated_noise: the covariance matrix is not symmetric at " + std::to_string(i) + ", " +
                             std::to_string(j));
        double rest = covariance[i][j];
        for (std::size_t k = 0; k < j; ++k) rest -= factor_[i][k] * factor_[j][k];
        if (j < i) {
          factor_[i][j] = rest / factor_[j][j];
          continue;
        }
        if (!(rest > 1e-14 * variance))
          throw bad_argument("correlated_noise: the covariance matrix is not positive definite; given the readings "
                             "before it, reading " + std::to_string(i) + " has a variance of " +
                             detail::short_number(rest));
        factor_[i][i] = detail::portable_sqrt(rest);
        log_constant_ -= detail::portable_log(factor_[i][i]);
      }
    }
    scale_ = detail::portable_sqrt(smallest);
  }

  matrix factor_{};
  double log_constant_ = 0.0;
  double scale_ = 0.0;
};

/// Several readings whose normal errors go together; the truth is the array of
/// their true values.
///   log density = -r^T C^-1 r / 2 - log(det C)/2 - N log(2 pi)/2,  r = reading - truth
/// @param covariance N x N, symmetric, positive definite; units: reading units squared
/// @throws bad_argument otherwise
/// Cost  factored here, once: N^3 / 6.
template <std::size_t N>
correlated_instrument<N> correlated_noise(std::array<std::array<double, N>, N> const& covariance) {
  return correlated_instrument<N>(covariance);
}

/// The same from nested braces: correlated_noise({{1.0, 0.5}, {0.5, 1.0}})
template <std::size_t N>
correlated_instrument<N> correlated_noise(double const (&covariance)[N][N]) {
  std::array<std::array<double, N>, N> rows{};
  for (std::size_t i = 0; i < N; ++i)
    for (std::size_t j = 0; j < N; ++j) rows[i][j] = covariance[i][j];
  return correlated_instrument<N>(rows);
}

}  // namespace steelyard::inline v1
