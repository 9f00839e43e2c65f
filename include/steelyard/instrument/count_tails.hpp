// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/base/elementary.hpp>
#include <steelyard/instrument/count_laws.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/quiet.hpp>

// Logarithms of incomplete gamma and beta functions, good where the functions
// themselves vanish.
namespace steelyard::inline v1::detail {

/// Below it Boost's incomplete gamma functions lose digits, for arguments of a million 12 of 16.
inline constexpr double smallest_share = 1e-30;

/// b0 + a1/(b1 + a2/(b2 + ...)), by the modified method of Lentz
/// [Thompson & Barnett, J. Comput. Phys. 64, 1986, 490]. All terms of what is
/// asked for here keep the partial denominators away from zero.
/// @param next called with k = 1, 2, ...: sets a_k and b_k
template <class F>
double continued_fraction(double first, F const& next) {
  double f = first, c = first, d = 0.0;
  for (int k = 1; k < 1'000'000; ++k) {
    double a = 0.0, b = 0.0;
    next(k, a, b);
    d = 1.0 / (b + a * d);
    c = b + a / c;
    double const step = c * d;
    f *= step;
    if (step - 1.0 < 1e-15 && 1.0 - step < 1e-15) break;
  }
  return f;
}

/// log P(a, x): the lower incomplete gamma function over Gamma(a), a > 0, x >= 0
inline double log_gamma_below(double a, double x) {
  if (!(x > 0.0)) return impossible;
  if (x > a) {
    double const beyond = boost::math::gamma_q(a, x, quiet{});
    return beyond < 0.5 ? portable_log1p(-beyond) : portable_log(boost::math::gamma_p(a, x, quiet{}));
  }
  double const share = boost::math::gamma_p(a, x, quiet{});
  if (share > smallest_share) return portable_log(share);
  double term = 1.0, sum = 1.0;  // x^a e^-x / Gamma(a+1) (1 + x/(a+1) + x^2/((a+1)(a+2)) + ...)
  for (int k = 1; k < 1'000'000 && term > 1e-17 * sum; ++k) {
    term *= x / (a + static_cast<double>(k));
    sum += term;
  }
  return log_poisson(a, x) + portable_log(sum);
}

/// log Q(a, x) = log(1 - P(a, x))
inline double log_gamma_above(double a, double x) {
  if (!(x > 0.0)) return 0.0;
  if (x < a) {
    double const before = boost::math::gamma_p(a, x, quiet{});
    return before < 0.5 ? portable_log1p(-before) : portable_log(boost::math::gamma_q(a, x, quiet{}));
  }
  double const share = boost::math::gamma_q(a, x, quiet{});
  if (share > smallest_share) return portable_log(share);
  // x^a e^-x / Gamma(a) over x+1-a - 1(1-a)/(x+3-a - 2(2-a)/(x+5-a - ...))
  double const fraction = continued_fraction(x + 1.0 - a, [&](int k, double& top, double& bottom) {
    double const n = static_cast<double>(k);
    top = -n * (n - a);
    bottom = x + 2.0 * n + 1.0 - a;
  });
  return log_poisson(a, x) + portable_log(a / fraction);
}

/// log I_x(a, b), the regularised incomplete beta function, a, b > 0
///   x^a y^b / B(a, b) over a continued fraction that needs x and y themselves,
///   not 1 - x  [Didonato & Morris, ACM Trans. Math. Softw. 18, 1992, 360]
/// @pre x + y = 1; both are asked for so that the smaller one may be exact
/// Cost  a few dozen divisions, near the middle some sqrt(a b / (a + b)) of them.
inline double log_beta_below(double a, double b, double x, double y) {
  if (!(x > 0.0)) return impossible;
  if (!(y > 0.0)) return 0.0;
  if (b * x > a * y) return log_complement(log_beta_below(b, a, y, x));  // the other side is the smaller or near it
  double const lead = a * y - b * x + 1.0;
  double const fraction = continued_fraction(lead / (a + 1.0), [=](int k, double& top, double& bottom) {
    double const m = static_cast<double>(k), before = a + 2.0 * m - 1.0;
    double const scale = k == 1 ? a : 1.0;  // the first level is divided by a, which may be small
    top = (a + m - 1.0) / before * ((a + b + m - 1.0) / before) * m * (b - m) * x * x / scale;
    bottom = m + m * (b - m) * x / before + (a + m) * (lead + m * (1.0 + y)) / (before + 2.0);
  });
  return log_binomial(a, b, x, y) + portable_log(b / (a + b)) - portable_log(fraction);
}

}  // namespace steelyard::inline v1::detail
