// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>

namespace steelyard::inline v1::detail {

/// Standard normal deviate z <= 0 with P(Z < z) = p, for a lower tail 0 < p <= 1/2.
///   Rational approximations of degree 7, about 1 part in 10^16
///   [Wichura, Algorithm AS 241 (PPND16), Applied Statistics 37(3), 1988]
/// Cost  one division in the middle; a logarithm and a root more for p < 0.075.
inline double normal_tail_quantile(double p) noexcept {
  constexpr double a[8] = {3.3871328727963666080e0,  1.3314166789178437745e+2, 1.9715909503065514427e+3,
                           1.3731693765509461125e+4, 4.5921953931549871457e+4, 6.7265770927008700853e+4,
                           3.3430575583588128105e+4, 2.5090809287301226727e+3};
  constexpr double b[8] = {1.0,
                           4.2313330701600911252e+1,
                           6.8718700749205790830e+2,
                           5.3941960214247511077e+3,
                           2.1213794301586595867e+4,
                           3.9307895800092710610e+4,
                           2.8729085735721942674e+4,
                           5.2264952788528545610e+3};
  constexpr double c[8] = {1.42343711074968357734e0,  4.63033784615654529590e0,  5.76949722146069140550e0,
                           3.64784832476320460504e0,  1.27045825245236838258e0,  2.41780725177450611770e-1,
                           2.27238449892691845833e-2, 7.74545014278341407640e-4};
  constexpr double d[8] = {1.0,
                           2.05319162663775882187e0,
                           1.67638483018380384940e0,
                           6.89767334985100004550e-1,
                           1.48103976427480074590e-1,
                           1.51986665636164571966e-2,
                           5.47593808499534494600e-4,
                           1.05075007164441684324e-9};
  constexpr double e[8] = {6.65790464350110377720e0,  5.46378491116411436990e0,  1.78482653991729133580e0,
                           2.96560571828504891230e-1, 2.65321895265761230930e-2, 1.24266094738807843860e-3,
                           2.71155556874348757815e-5, 2.01033439929228813265e-7};
  constexpr double f[8] = {1.0,
                           5.99832206555887937690e-1,
                           1.36929880922735805310e-1,
                           1.48753612908506148525e-2,
                           7.86869131145613259100e-4,
                           1.84631831751005468180e-5,
                           1.42151175831644588870e-7,
                           2.04426310338993978564e-15};
  double const q = minus(p, 0.5);
  if (q >= -0.425) {
    double const r = minus(0.180625, times(q, q));
    return times(q, over(polynomial(a, r), polynomial(b, r)));
  }
  double const r = portable_sqrt(-portable_log(p));
  if (r <= 5.0) {
    double const s = minus(r, 1.6);
    return -over(polynomial(c, s), polynomial(d, s));
  }
  double const s = minus(r, 5.0);
  return -over(polynomial(e, s), polynomial(f, s));
}

/// z with P(Z < z) = p, standard normal.
/// @pre 0 < p < 1. For p near 1 say `normal_upper_quantile(1 - p)`, which keeps the tail.
inline double normal_quantile(double p) noexcept {
  return p <= 0.5 ? normal_tail_quantile(p) : -normal_tail_quantile(minus(1.0, p));
}

/// z with P(Z > z) = q, standard normal, accurate for small q.
/// @pre 0 < q < 1
inline double normal_upper_quantile(double q) noexcept { return -normal_quantile(q); }

}  // namespace steelyard::inline v1::detail
