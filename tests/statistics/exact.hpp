// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <boost/math/distributions/normal.hpp>
#include <boost/math/policies/policy.hpp>
#include <boost/math/quadrature/gauss.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <functional>
#include <numbers>
#include <vector>

// Exact answers: a posterior is a distribution of Boost.Math, a finite sum, or an integral over one number.

namespace known {

/// The exact posterior of x, and the evidence.
struct posterior {
  double mean = 0.0;
  double variance = 0.0;
  double log_evidence = 0.0;
  std::function<double(double)> below;     ///< P(x <= v)
  std::function<double(double)> quantile;  ///< inf{v : below(v) >= p}
  bool lattice = false;                    ///< x is a whole number
};

using quiet = boost::math::policies::policy<boost::math::policies::promote_double<false>>;

template <class Distribution>
posterior known_as(Distribution const& d, double log_evidence) {
  posterior p;
  p.mean = mean(d);
  p.variance = variance(d);
  p.log_evidence = log_evidence;
  p.below = [d](double v) { return cdf(d, v); };
  p.quantile = [d](double order) { return quantile(d, order); };
  return p;
}

/// From log(prior density x likelihood) by Gauss-Legendre quadrature over 400 panels of [low, high].
inline posterior by_quadrature(std::function<double(double)> log_product, double low, double high) {
  constexpr std::size_t panels = 400;
  using rule = boost::math::quadrature::gauss<double, 20>;
  auto const edge = [=](std::size_t k) { return low + (high - low) * static_cast<double>(k) / panels; };
  auto const over = [=](auto f, double a, double b) {
    return rule::integrate([&](double v) { return f(v) * std::exp(log_product(v)); }, a, b);
  };
  auto const one = [](double) { return 1.0; };
  std::vector<double> upto{0.0};
  double first = 0.0, second = 0.0;
  for (std::size_t k = 0; k < panels; ++k) {
    upto.push_back(upto.back() + over(one, edge(k), edge(k + 1)));
    first += over([](double v) { return v; }, edge(k), edge(k + 1));
  }
  double const total = upto.back(), mean = first / total;
  for (std::size_t k = 0; k < panels; ++k)
    second += over([mean](double v) { return (v - mean) * (v - mean); }, edge(k), edge(k + 1));
  posterior p;
  p.mean = mean;
  p.variance = second / total;
  p.log_evidence = std::log(total);
  p.below = [=](double v) {
    if (!(v > low)) return 0.0;
    if (!(v < high)) return 1.0;
    auto const k = std::min(panels - 1, static_cast<std::size_t>((v - low) / (high - low) * panels));
    return (upto[k] + (v > edge(k) ? over(one, edge(k), v) : 0.0)) / total;
  };
  p.quantile = [below = p.below, low, high](double order) {
    double a = low, b = high;
    for (int halving = 0; halving < 60; ++halving) {
      double const middle = 0.5 * (a + b);
      (below(middle) >= order ? b : a) = middle;
    }
    return b;
  };
  return p;
}

/// From log(prior probability x likelihood) of the whole numbers 0, 1, ..., last.
inline posterior by_sum(std::function<double(double)> const& log_product, std::size_t last) {
  std::vector<double> share;
  double total = 0.0;
  for (std::size_t k = 0; k <= last; ++k) total += share.emplace_back(std::exp(log_product(static_cast<double>(k))));
  posterior p;
  p.lattice = true;
  p.log_evidence = std::log(total);
  for (double& each : share) each /= total;
  for (std::size_t k = 0; k <= last; ++k) p.mean += share[k] * static_cast<double>(k);
  for (std::size_t k = 0; k <= last; ++k) p.variance += share[k] * std::pow(static_cast<double>(k) - p.mean, 2);
  p.below = [share](double v) {
    double sum = 0.0;
    for (std::size_t k = 0; k < share.size() && static_cast<double>(k) <= v; ++k) sum += share[k];
    return sum;
  };
  p.quantile = [share](double order) {
    double sum = 0.0;
    std::size_t k = 0;
    while (k + 1 < share.size() && (sum += share[k]) < order) ++k;
    return static_cast<double>(k);
  };
  return p;
}

// --- densities and distributions -----------------------------------------------------------------------------------------

inline double log_normal_density(double x, double mean, double sd) {
  double const z = (x - mean) / sd;
  return -0.5 * z * z - std::log(sd) - 0.5 * std::log(2.0 * std::numbers::pi);
}
inline double log_gamma(double a) { return boost::math::lgamma(a, quiet()); }
inline double log_poisson(double k, double mean) { return k * std::log(mean) - mean - log_gamma(k + 1.0); }
inline double log_gamma_density(double x, double shape, double rate) {
  return shape * std::log(rate) + (shape - 1.0) * std::log(x) - rate * x - log_gamma(shape);
}
/// P(Z <= z) of a standard normal.
inline double normal_below(double z) { return 0.5 * std::erfc(-z / std::numbers::sqrt2); }

inline posterior normal(double mean, double sd, double log_evidence) {
  return known_as(boost::math::normal_distribution<double, quiet>(mean, sd), log_evidence);
}
/// A normal prior N(0, 1) under a normal reading.
inline posterior normal_given(double reading, double sd) {
  double const variance = 1.0 / (1.0 + 1.0 / (sd * sd));
  return normal(variance * reading / (sd * sd), std::sqrt(variance),
                log_normal_density(reading, 0.0, std::sqrt(1.0 + sd * sd)));
}

/// A standard normal prior under a score.
inline posterior normal_under(std::function<double(double)> score, double low, double high, double log_factor = 0.0) {
  return by_quadrature([=](double x) { return log_normal_density(x, 0.0, 1.0) + score(x) + log_factor; }, low, high);
}

}  // namespace known
