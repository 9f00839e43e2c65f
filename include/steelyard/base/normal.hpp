// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstdint>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>

namespace steelyard::inline v1::detail {

// Standard normal deviates: rational approximations of degree 7, about 1 part in 10^16
//   [Wichura, Algorithm AS 241 (PPND16), Applied Statistics 37(3), 1988]

inline constexpr double normal_middle_numerator[8] = {
    3.3871328727963666080e0, 1.3314166789178437745e+2, 1.9715909503065514427e+3, 1.3731693765509461125e+4,
    4.5921953931549871457e+4, 6.7265770927008700853e+4, 3.3430575583588128105e+4, 2.5090809287301226727e+3};
inline constexpr double normal_middle_denominator[8] = {
    1.0, 4.2313330701600911252e+1, 6.8718700749205790830e+2, 5.3941960214247511077e+3,
    2.1213794301586595867e+4, 3.9307895800092710610e+4, 2.8729085735721942674e+4, 5.2264952788528545610e+3};

/// z with P(Z < z) = 1/2 + q, |q| <= 0.425.
/// Cost  one division.
inline double normal_middle_quantile(double q) noexcept {
  double const r = minus(0.180625, times(q, q));
  return times(q, over(polynomial(normal_middle_numerator, r), polynomial(normal_middle_denominator, r)));
}

/// z < 0 with P(Z < z) = p for a lower tail 0 < p < 0.075.
/// Cost  a logarithm, a root and a division.
inline double normal_far_quantile(double p) noexcept {
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
  double const r = portable_sqrt(-portable_log(p));
  if (r <= 5.0) {
    double const s = minus(r, 1.6);
    return -over(polynomial(c, s), polynomial(d, s));
  }
  double const s = minus(r, 5.0);
  return -over(polynomial(e, s), polynomial(f, s));
}

/// z <= 0 with P(Z < z) = p for a lower tail 0 < p <= 1/2.
inline double normal_tail_quantile(double p) noexcept {
  double const q = minus(p, 0.5);
  return q >= -0.425 ? normal_middle_quantile(q) : normal_far_quantile(p);
}

/// z with P(Z < z) = p, standard normal.
/// @pre 0 < p < 1. For p near 1 say `normal_upper_quantile(1 - p)`, which keeps the tail.
inline double normal_quantile(double p) noexcept {
  return p <= 0.5 ? normal_tail_quantile(p) : -normal_tail_quantile(minus(1.0, p));
}

/// z with P(Z > z) = q, standard normal, accurate for small q.
/// @pre 0 < q < 1
inline double normal_upper_quantile(double q) noexcept { return -normal_quantile(q); }

/// P(Z > z) for z >= 0, within 5 units in the last place down to where it vanishes.
///   (1 + 5z/4) exp(z^2/2) P(Z > z) as a polynomial in t = (z - 5)/(z + 5), a minimax
///   fit made for this file (1e-17 for z <= 39)
///   [the change of variable: Shepherd & Laframboise, Math. Comp. 36, 1981]
inline double normal_tail(double z) noexcept {
  constexpr double c[23] = {
      0x1.1d864303d4c84p-1, -0x1.41d8de9621f76p-4, 0x1.402b0e1739800p-7, 0x1.0c13034c16134p-5,
      -0x1.705abcacd1c16p-5, 0x1.2b35cdd20a8eep-5, -0x1.5b84cd88c8f4ap-6, 0x1.1ea0ee8b738fcp-7,
      -0x1.19cd4b7f91ef2p-9, -0x1.8fcb66ceda57ap-16, 0x1.fda8e02f30dd9p-13, -0x1.1a117459dc139p-14,
      -0x1.d6d49b470c3dep-17, 0x1.86b3123ac7963p-17, 0x1.63eb6b2c621fep-24, -0x1.c7bc1cf45ae5bp-20,
      0x1.24ba77bcf8591p-23, 0x1.14ad83fa9c30dp-22, -0x1.a6f66e8949dd7p-26, -0x1.5f63754b75583p-25,
      0x1.d186898855fd7p-34, 0x1.56ae0358bbc0dp-28, 0x1.0271c488757e7p-30};
  if (z == 0.0) return 0.5;
  if (z > 38.6) return 0.0;
  double const height = polynomial(c, over(minus(z, 5.0), plus(z, 5.0)));
  // exp(-z^2/2) loses digits to the rounding of z^2: square the leading 26 bits exactly, the rest apart
  double const lead = std::bit_cast<double>(std::bit_cast<std::uint64_t>(z) & ~std::uint64_t{0x7ffffff});
  double const rest = times(times(minus(z, lead), plus(z, lead)), 0.5);  // below 3e-5
  double const decay = plus(1.0, -times(rest, minus(1.0, times(rest, minus(0.5, times(rest, 1.0 / 6.0))))));
  double const bell = portable_exp(-times(times(lead, lead), 0.5));
  return times(bell, over(times(height, decay), plus(1.0, times(1.25, z))));
}

/// P(Z > z), standard normal, accurate in the upper tail.
inline double normal_upper(double z) noexcept { return z >= 0.0 ? normal_tail(z) : minus(1.0, normal_tail(-z)); }

/// P(Z < z), standard normal, accurate in the lower tail.
inline double normal_cdf(double z) noexcept { return normal_upper(-z); }

}  // namespace steelyard::inline v1::detail
