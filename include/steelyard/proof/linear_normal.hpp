// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cmath>
#include <cstddef>
#include <string>

#include <boost/math/distributions/normal.hpp>

#include <steelyard/base/error.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/checked.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1::proof {

namespace detail {

template <std::size_t N>
using column = std::array<double, N>;
template <std::size_t Rows, std::size_t Columns>
using matrix = std::array<std::array<double, Columns>, Rows>;

/// Lower Cholesky factor of a covariance. @throws bad_argument unless it is symmetric and positive definite.
template <std::size_t N>
matrix<N, N> cholesky(char const* what, matrix<N, N> const& a) {
  matrix<N, N> l{};
  for (std::size_t i = 0; i < N; ++i)
    for (std::size_t j = 0; j <= i; ++j) {
      double sum = finite("linear_normal", what, a[i][j]);
      for (std::size_t k = 0; k < j; ++k) sum -= l[i][k] * l[j][k];
      if (a[i][j] != a[j][i] || (i == j && !(sum > 0.0)))
        throw bad_argument(std::string("linear_normal: ") + what + " must be symmetric and positive definite");
      l[i][j] = i == j ? std::sqrt(sum) : sum / l[j][j];
    }
  return l;
}
/// Solves L x = b.
template <std::size_t N>
column<N> solve(matrix<N, N> const& l, column<N> b) {
  for (std::size_t i = 0; i < N; ++i) {
    for (std::size_t k = 0; k < i; ++k) b[i] -= l[i][k] * b[k];
    b[i] /= l[i][i];
  }
  return b;
}
/// Log-density of N(0, L L^T) at x.
template <std::size_t N>
double log_normal_density(matrix<N, N> const& l, column<N> const& x) {
  column<N> const z = solve(l, x);
  double sum = 0.0;
  for (std::size_t i = 0; i < N; ++i) sum -= 0.5 * z[i] * z[i] + std::log(l[i][i]) + 0.918938533204672741780;
  return sum;
}

}  // namespace detail

/// D unknowns x ~ N(m, P), K readings y = H x + noise of covariance R. State: std::array<double, D>.
///   S = H P H^T + R, posterior mean m + P H^T S^-1 (y - H m), covariance P - P H^T S^-1 H P
///   evidence: the density of y under N(H m, S)
/// @throws bad_argument unless P and R are symmetric and positive definite and every number is finite.
template <std::size_t D, std::size_t K>
class linear_normal {
 public:
  using state = std::array<double, D>;
  using readings = std::array<double, K>;

  linear_normal(state const& prior_mean, std::array<state, D> const& prior_covariance, std::array<state, K> const& h,
                readings const& y, std::array<readings, K> const& noise_covariance)
      : mean_(prior_mean), covariance_(prior_covariance), h_(h), y_(y),
        prior_(detail::cholesky("the prior covariance", prior_covariance)),
        noise_(detail::cholesky("the covariance of the readings", noise_covariance)) {
    for (double const each : prior_mean) detail::finite("linear_normal", "the prior mean", each);
    detail::matrix<K, D> hp{};
    detail::matrix<K, K> s = noise_covariance;
    for (std::size_t k = 0; k < K; ++k) {
      detail::finite("linear_normal", "a reading", y[k]);
      for (std::size_t i = 0; i < D; ++i) {
        detail::finite("linear_normal", "a coefficient", h[k][i]);
        for (std::size_t j = 0; j < D; ++j) hp[k][j] += h[k][i] * prior_covariance[i][j];
      }
    }
    for (std::size_t k = 0; k < K; ++k)
      for (std::size_t l = 0; l <= k; ++l) {
        for (std::size_t i = 0; i < D; ++i) s[k][l] += hp[k][i] * h[l][i];
        s[l][k] = s[k][l];
      }
    detail::matrix<K, K> const factor = detail::cholesky("the covariance of the readings", s);
    readings const gap = off(prior_mean), z = detail::solve(factor, gap);
    log_evidence_ = detail::log_normal_density(factor, gap);
    // Column i of L^-1 H P gives what the readings say of unknown i.
    std::array<readings, D> told{};
    for (std::size_t i = 0; i < D; ++i) {
      readings column{};
      for (std::size_t k = 0; k < K; ++k) column[k] = hp[k][i];
      told[i] = detail::solve(factor, column);
    }
    for (std::size_t i = 0; i < D; ++i)
      for (std::size_t k = 0; k < K; ++k) {
        mean_[i] += told[i][k] * z[k];
        for (std::size_t j = 0; j < D; ++j) covariance_[i][j] -= told[i][k] * told[j][k];
      }
    prior_mean_ = prior_mean;
  }

  [[nodiscard]] auto sampler() const {
    return [m = prior_mean_, l = prior_](draws& d) {
      state z{}, x = m;
      for (std::size_t i = 0; i < D; ++i) {
        z[i] = d.normal();
        for (std::size_t k = 0; k <= i; ++k) x[i] += l[i][k] * z[k];
      }
      return x;
    };
  }
  [[nodiscard]] auto weighter() const {
    return [*this](state const& x) { return log_likelihood{detail::log_normal_density(noise_, off(x))}; };
  }
  [[nodiscard]] double mean(std::size_t i) const { return mean_.at(i); }
  [[nodiscard]] double covariance(std::size_t i, std::size_t j) const { return covariance_.at(i).at(j); }
  [[nodiscard]] double sd(std::size_t i) const { return std::sqrt(covariance(i, i)); }
  [[nodiscard]] double log_evidence() const { return log_evidence_; }
  /// Posterior of unknown i alone.
  [[nodiscard]] boost::math::normal_distribution<double> posterior(std::size_t i) const { return {mean(i), sd(i)}; }

 private:
  /// y - H x.
  [[nodiscard]] readings off(state const& x) const {
    readings gap = y_;
    for (std::size_t k = 0; k < K; ++k)
      for (std::size_t i = 0; i < D; ++i) gap[k] -= h_[k][i] * x[i];
    return gap;
  }

  state mean_, prior_mean_{};
  std::array<state, D> covariance_;
  std::array<state, K> h_;
  readings y_;
  detail::matrix<D, D> prior_;
  detail::matrix<K, K> noise_;
  double log_evidence_ = 0.0;
};

}  // namespace steelyard::inline v1::proof
