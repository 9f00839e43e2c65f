// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <vector>

#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/special_functions/beta.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/draw/draws.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1::proof {

/// Normal prior, one normal reading. State: the unknown.
///   posterior normal; evidence: the reading's density under N(prior mean, prior sd^2 + reading sd^2)
class normal_normal {
 public:
  normal_normal(double prior_mean, double prior_sd, double reading, double reading_sd)
      : m_(prior_mean), s_(prior_sd), y_(reading), r_(reading_sd) {}

  [[nodiscard]] auto sampler() const {
    return [m = m_, s = s_](draws& d) { return d.normal(m, s); };
  }
  [[nodiscard]] auto weighter() const {
    return [y = y_, r = r_](double x) {
      double const z = (y - x) / r;
      return log_likelihood{-0.5 * z * z - std::log(r) - half_log_two_pi};
    };
  }
  [[nodiscard]] double mean() const { return (m_ / (s_ * s_) + y_ / (r_ * r_)) / (1.0 / (s_ * s_) + 1.0 / (r_ * r_)); }
  [[nodiscard]] double sd() const { return 1.0 / std::sqrt(1.0 / (s_ * s_) + 1.0 / (r_ * r_)); }
  [[nodiscard]] double log_evidence() const {
    double const v = s_ * s_ + r_ * r_;
    return -0.5 * (y_ - m_) * (y_ - m_) / v - 0.5 * std::log(v) - half_log_two_pi;
  }
  [[nodiscard]] boost::math::normal_distribution<double> posterior() const { return {mean(), sd()}; }

 private:
  static constexpr double half_log_two_pi = 0.918938533204672741780;
  double m_, s_, y_, r_;
};

/// Gamma prior (shape, rate) on a Poisson mean, counts read. State: the mean.
///   posterior gamma(shape + sum, rate + n)
class gamma_poisson {
 public:
  gamma_poisson(double shape, double rate, std::vector<unsigned> counts) : a_(shape), b_(rate), counts_(std::move(counts)) {
    for (unsigned const c : counts_) {
      sum_ += c;
      log_factorials_ += boost::math::lgamma(static_cast<double>(c) + 1.0);
    }
  }

  [[nodiscard]] auto sampler() const {
    return [prior = boost::math::gamma_distribution<double>(a_, 1.0 / b_)](draws& d) { return d.from(prior); };
  }
  [[nodiscard]] auto weighter() const {
    return [n = static_cast<double>(counts_.size()), sum = sum_, f = log_factorials_](double rate) {
      return log_likelihood{sum * std::log(rate) - n * rate - f};
    };
  }
  [[nodiscard]] double mean() const { return (a_ + sum_) / rate(); }
  [[nodiscard]] double sd() const { return std::sqrt(a_ + sum_) / rate(); }
  [[nodiscard]] double log_evidence() const {
    return a_ * std::log(b_) - boost::math::lgamma(a_) + boost::math::lgamma(a_ + sum_) - (a_ + sum_) * std::log(rate()) -
           log_factorials_;
  }
  [[nodiscard]] boost::math::gamma_distribution<double> posterior() const { return {a_ + sum_, 1.0 / rate()}; }

 private:
  [[nodiscard]] double rate() const { return b_ + static_cast<double>(counts_.size()); }
  double a_, b_;
  std::vector<unsigned> counts_;
  double sum_ = 0.0, log_factorials_ = 0.0;
};

/// Beta prior on a share, k hits of n read. State: the share.
///   posterior beta(a + k, b + n - k)
class beta_binomial {
 public:
  beta_binomial(double a, double b, unsigned hits, unsigned trials) : a_(a), b_(b), k_(hits), n_(trials) {}

  [[nodiscard]] auto sampler() const {
    return [prior = boost::math::beta_distribution<double>(a_, b_)](draws& d) { return d.from(prior); };
  }
  [[nodiscard]] auto weighter() const {
    return [k = k_, n = n_, c = log_choose()](double p) {
      return log_likelihood{c + k * std::log(p) + (n - k) * std::log1p(-p)};
    };
  }
  [[nodiscard]] double mean() const { return (a_ + k_) / (a_ + b_ + n_); }
  [[nodiscard]] double sd() const {
    double const a = a_ + k_, b = b_ + n_ - k_;
    return std::sqrt(a * b / ((a + b) * (a + b) * (a + b + 1.0)));
  }
  [[nodiscard]] double log_evidence() const {
    return log_choose() + log_beta(a_ + k_, b_ + n_ - k_) - log_beta(a_, b_);
  }
  [[nodiscard]] boost::math::beta_distribution<double> posterior() const { return {a_ + k_, b_ + n_ - k_}; }

 private:
  static double log_beta(double a, double b) {
    return boost::math::lgamma(a) + boost::math::lgamma(b) - boost::math::lgamma(a + b);
  }
  [[nodiscard]] double log_choose() const {
    return boost::math::lgamma(n_ + 1.0) - boost::math::lgamma(k_ + 1.0) - boost::math::lgamma(n_ - k_ + 1.0);
  }
  double a_, b_, k_, n_;
};

/// D standard normal unknowns, one normal reading of h . x. State: std::array<double, D>.
///   posterior mean h y / (|h|^2 + s^2), covariance I - h h^T / (|h|^2 + s^2)
template <std::size_t D>
class linear_reading {
 public:
  using state = std::array<double, D>;
  linear_reading(state const& h, double reading, double reading_sd) : h_(h), y_(reading), s_(reading_sd) {}

  [[nodiscard]] auto sampler() const {
    return [](draws& d) {
      state x{};
      for (double& each : x) each = d.normal();
      return x;
    };
  }
  [[nodiscard]] auto weighter() const {
    return [h = h_, y = y_, s = s_](state const& x) {
      double gap = y;
      for (std::size_t i = 0; i < D; ++i) gap -= h[i] * x[i];
      return log_likelihood{-0.5 * (gap / s) * (gap / s) - std::log(s) - 0.918938533204672741780};
    };
  }
  [[nodiscard]] double mean(std::size_t i) const { return h_[i] * y_ / total(); }
  [[nodiscard]] double covariance(std::size_t i, std::size_t j) const { return (i == j ? 1.0 : 0.0) - h_[i] * h_[j] / total(); }
  [[nodiscard]] double log_evidence() const {
    return -0.5 * y_ * y_ / total() - 0.5 * std::log(total()) - 0.918938533204672741780;
  }

 private:
  [[nodiscard]] double total() const {
    double sum = s_ * s_;
    for (double const each : h_) sum += each * each;
    return sum;
  }
  state h_;
  double y_, s_;
};

}  // namespace steelyard::inline v1::proof
