// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/base/elementary.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/quiet.hpp>

// Logarithms of Poisson and binomial probabilities without large terms that
// cancel, for any real x and n, by saddle points
// [Loader, Fast and accurate computation of binomial probabilities, 2000].
namespace steelyard::inline v1::detail {

/// What Stirling's formula misses: log Gamma(x + 1) - (x + 1/2) log x + x - log(2 pi)/2, x > 0.
inline double stirling_error(double x) {
  if (x >= 16.0) {
    double const s = 1.0 / (x * x);
    constexpr double c[7] = {1.0 / 12, -1.0 / 360, 1.0 / 1260, -1.0 / 1680, 1.0 / 1188, -691.0 / 360360, 1.0 / 156};
    double sum = c[6];
    for (int k = 5; k >= 0; --k) sum = sum * s + c[k];
    return sum / x;
  }
  constexpr double whole[16] = {0.0,  // from 50-digit arithmetic
                                0.081061466795327261,  0.041340695955409297,  0.027677925684998338,
                                0.020790672103765093,  0.016644691189821193,  0.013876128823070748,
                                0.01189670994589177,   0.010411265261972096,  0.0092554621827127329,
                                0.0083305634333628708, 0.0075736754879518406, 0.0069428401072095299,
                                0.0064089941880042071, 0.0059513701127588475, 0.0055547335519628011};
  int const k = static_cast<int>(x);
  if (x == static_cast<double>(k)) return whole[k];
  return boost::math::lgamma(x + 1.0, quiet{}) - (x + 0.5) * portable_log(x) + x - half_log_two_pi;
}

/// x log(x / mean) + mean - x, x > 0, mean > 0: how far x is from its mean, on
/// the scale of log-likelihood. Near the mean by the series of artanh, all terms of one sign.
inline double deviance(double x, double mean) {
  double const gap = x - mean;
  if (gap < 0.1 * (x + mean) && -gap < 0.1 * (x + mean)) {
    double const v = gap / (x + mean), square = v * v;
    double term = 2.0 * x * v, sum = gap * v;
    for (int k = 3; k < 60; k += 2) {
      term *= square;
      double const next = sum + term / static_cast<double>(k);
      if (next == sum) break;
      sum = next;
    }
    return sum;
  }
  return x * log_ratio(x, mean) - gap;
}

/// log(mean^x e^-mean / Gamma(x + 1)), x >= 0, mean >= 0
inline double log_poisson(double x, double mean) {
  if (!(x > 0.0)) return -mean;
  if (!(mean > 0.0)) return impossible;
  return -stirling_error(x) - deviance(x, mean) - half_log_two_pi - 0.5 * portable_log(x);
}

/// log(Gamma(n+1) / (Gamma(x+1) Gamma(rest+1)) p^x q^rest), n = x + rest, x and rest >= 0
/// @pre p + q = 1; all four are asked for so that the smaller ones may be exact
inline double log_binomial(double x, double rest, double p, double q) {
  double const n = x + rest;
  if (!(p > 0.0)) return x > 0.0 ? impossible : 0.0;
  if (!(q > 0.0)) return rest > 0.0 ? impossible : 0.0;
  if (!(x > 0.0)) return n * (p < 0.5 ? portable_log1p(-p) : portable_log(q));
  if (!(rest > 0.0)) return n * (q < 0.5 ? portable_log1p(-q) : portable_log(p));
  return stirling_error(n) - stirling_error(x) - stirling_error(rest) - deviance(x, n * p) - deviance(rest, n * q) -
         half_log_two_pi - 0.5 * (portable_log(x) + portable_log(rest / n));
}

}  // namespace steelyard::inline v1::detail
