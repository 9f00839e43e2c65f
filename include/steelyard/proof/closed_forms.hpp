// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <string>
#include <utility>
#include <vector>

#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/base/error.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/from.hpp>
#include <steelyard/proof/checked.hpp>
#include <steelyard/weigh/likelihood.hpp>

// Models with known answers, for tests of one's own plumbing. Each has a sampler and a weighter for a pipeline, and
// what must come out: the posterior as a distribution of Boost.Math, its mean and sd, and the log-evidence, constants
// included.

namespace steelyard::inline v1::proof {

/// Normal prior, one normal reading. State: the unknown.
///   posterior normal; evidence: the reading's density under N(prior mean, prior sd^2 + reading sd^2)
class normal_normal {
 public:
  normal_normal(double prior_mean, double prior_sd, double reading, double reading_sd)
      : m_(detail::finite("normal_normal", "the prior mean", prior_mean)),
        s_(detail::positive("normal_normal", "the prior sd", prior_sd)),
        y_(detail::finite("normal_normal", "the reading", reading)),
        r_(detail::positive("normal_normal", "the reading's sd", reading_sd)) {}

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
  gamma_poisson(double shape, double rate, std::vector<unsigned> counts)
      : a_(detail::positive("gamma_poisson", "the shape", shape)),
        b_(detail::positive("gamma_poisson", "the rate", rate)),
        counts_(std::move(counts)) {
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
    return a_ * std::log(b_) - boost::math::lgamma(a_) + boost::math::lgamma(a_ + sum_) -
           (a_ + sum_) * std::log(rate()) - log_factorials_;
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
  beta_binomial(double a, double b, unsigned hits, unsigned trials)
      : a_(detail::positive("beta_binomial", "the first shape", a)),
        b_(detail::positive("beta_binomial", "the second shape", b)), k_(hits), n_(trials) {
    if (hits > trials)
      throw bad_argument("beta_binomial: " + std::to_string(hits) + " hits of " + std::to_string(trials) +
                         " trials; there can be no more hits than trials");
  }

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
  [[nodiscard]] static double log_beta(double a, double b) {
    return boost::math::lgamma(a) + boost::math::lgamma(b) - boost::math::lgamma(a + b);
  }
  [[nodiscard]] double log_choose() const {
    return boost::math::lgamma(n_ + 1.0) - boost::math::lgamma(k_ + 1.0) - boost::math::lgamma(n_ - k_ + 1.0);
  }
  double a_, b_, k_, n_;
};

}  // namespace steelyard::inline v1::proof
