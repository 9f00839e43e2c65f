// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <limits>
#include <span>
#include <string>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/top_weights.hpp>

namespace steelyard::inline v1 {

/// A generalised Pareto law of what lies above a threshold:
///   P(X > x) = (1 + shape x / scale)^(-1/shape)
/// A shape of 1/k and more means no k-th moment; below 0 there is an end.
struct pareto_tail {
  double shape = 0.0;
  double scale = 0.0;
  double standard_error = 0.0;  ///< of the shape, about: that of the maximum likelihood fit, (1 + shape)/sqrt n
  bool known = false;           ///< false where there is too little to fit, or a quarter of it lies on the threshold
};

/// Fits a generalised Pareto law to excesses over a threshold, in rising order.
///   [Zhang & Stephens, Technometrics 51(3), 2009, 316]
/// @throws bad_argument unless the excesses are finite, not negative and in order.
/// Cost  20 + sqrt(n) products an excess, and as many logarithms for each 16 of them.
inline pareto_tail fit_pareto_tail(std::span<double const> excesses) {
  std::size_t const n = excesses.size();
  for (std::size_t i = 0; i < n; ++i)
    if (!detail::is_finite(excesses[i]) || !(excesses[i] >= (i > 0 ? excesses[i - 1] : 0.0)))
      throw bad_argument("fit_pareto_tail: excess " + std::to_string(i) + " is " + detail::plain_number(excesses[i]) +
                         "; excesses must be finite, zero or more, and in rising order");
  double const size = static_cast<double>(n);
  std::size_t const quarter = static_cast<std::size_t>(size / 4.0 + 0.5);
  if (n < 5 || !(excesses[quarter - 1] > 0.0)) return {};
  double const top = excesses[n - 1];
  auto const mean_log = [&](double theta) {
    double sum = 0.0;
    for (double const x : excesses) sum += detail::portable_log1p(-theta * x);
    return sum / size;
  };
  // The same for a likelihood: logarithms of products, of as many factors as cannot overflow. The smallest factor is above
  // 1e-3. Where all are close to 1, the products would lose what they differ by.
  auto const mean_log_of_products = [&](double theta) {
    double const largest = 1.0 + std::abs(theta) * top;
    if (std::abs(theta) * excesses[quarter - 1] < 1e-3 || largest > 1e60) return mean_log(theta);
    std::size_t const together = largest > 1e15 ? 4 : 16;
    double sum = 0.0;
    for (std::size_t from = 0; from < n; from += together) {
      double product = 1.0;
      for (std::size_t i = from; i < std::min(n, from + together); ++i) product *= 1.0 - theta * excesses[i];
      sum += detail::portable_log(product);
    }
    return sum / size;
  };
  double const m = 20.0 + std::floor(std::sqrt(size));
  std::vector<double> thetas, likelihoods;
  double highest = std::numeric_limits<double>::lowest();
  for (double j = 0.5; j < m; j += 1.0) {
    double theta = 1.0 / top + (1.0 - std::sqrt(m / j)) / (3.0 * excesses[quarter - 1]);
    if (theta == 0.0) theta = std::numeric_limits<double>::epsilon() / top;
    double const kappa = -mean_log_of_products(theta);
    thetas.push_back(theta);
    likelihoods.push_back(size * (detail::portable_log(theta / kappa) + kappa - 1.0));
    highest = std::max(highest, likelihoods.back());
  }
  double sum = 0.0, weighted = 0.0;
  for (std::size_t j = 0; j < thetas.size(); ++j) {
    double const w = detail::portable_exp(likelihoods[j] - highest);
    sum += w;
    weighted += w * thetas[j];
  }
  double const theta = weighted / sum, shape = mean_log(theta);
  return {shape, -shape / theta, std::max(0.0, 1.0 + shape) / std::sqrt(size), true};
}

namespace detail {

/// Tail of the largest weights among n positive ones: the min(n/5, 3 sqrt n, 256)
/// largest, less the next.     [Vehtari, Simpson, Gelman, Yao & Gabry, JMLR 25(72), 2024, for n/5 and 3 sqrt n]
/// 256 bound what a run must keep; they tell a shape of 0.7 within 0.11.
inline pareto_tail tail_of(top_weights const& largest, double n) {
  std::vector<double> logs = largest.sorted();
  auto const wanted = static_cast<std::size_t>(std::ceil(std::min(std::min(0.2 * n, 3.0 * std::sqrt(n)), 256.0)));
  if (wanted < 5 || logs.size() <= wanted) return {};
  std::size_t const first = logs.size() - wanted;
  double const maximum = logs.back(), threshold = portable_exp(logs[first - 1] - maximum);
  std::vector<double> excesses;
  for (std::size_t i = first; i < logs.size(); ++i)
    excesses.push_back(std::max(0.0, portable_exp(logs[i] - maximum) - threshold));
  return fit_pareto_tail(excesses);
}

}  // namespace detail

}  // namespace steelyard::inline v1
