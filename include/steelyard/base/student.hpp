// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <limits>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/normal.hpp>

namespace steelyard::inline v1::detail {

/// log(Gamma(a + 1/2) / Gamma(a)) for a > 0: the asymptotic series from 24 on,
/// the recurrence of the gamma function below.
///   1/2 log a - 1/(8a) + 1/(192 a^3) - 1/(640 a^5) + 17/(14336 a^7)   [from DLMF 5.11.8]
inline double log_gamma_step(double a) noexcept {
  double product = 1.0;
  for (; a < 24.0; a += 1.0) product *= a / (a + 0.5);
  double const r = 1.0 / a;
  double const r2 = r * r;
  double const series = r * (-1.0 / 8 + r2 * (1.0 / 192 + r2 * (-1.0 / 640 + r2 * (17.0 / 14336))));
  return 0.5 * portable_log(a) + series + portable_log(product);
}

/// Continued fraction of the incomplete beta function: I_x(a, b) divided by
/// x^a (1 - x)^b / (a B(a, b)), evaluated forwards.
///   [DLMF 8.17.22; modified Lentz's rule: Thompson & Barnett, J. Comput. Phys. 64, 1986]
/// @pre x < (a + 1)/(a + b + 2), where it converges fast
inline double beta_fraction(double a, double b, double x) noexcept {
  constexpr double tiny = 1e-290;
  auto const away_from_zero = [](double v) { return v > -tiny && v < tiny ? tiny : v; };
  double c = 1.0;
  double d = 1.0 / away_from_zero(1.0 - (a + b) * x / (a + 1.0));
  double fraction = d;
  for (double m = 1.0; m < 1e6; m += 1.0) {
    double const even = m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m));
    d = 1.0 / away_from_zero(1.0 + even * d);
    c = away_from_zero(1.0 + even / c);
    fraction *= c * d;
    double const odd = -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0));
    d = 1.0 / away_from_zero(1.0 + odd * d);
    c = away_from_zero(1.0 + odd / c);
    double const change = c * d;
    fraction *= change;
    if (change > 1.0 - 1e-15 && change < 1.0 + 1e-15) break;
  }
  return fraction;
}

/// Student's t with `dof` degrees of freedom at t > 0, as far as root finding
/// needs it: the part of the probability that keeps its digits there.
struct student_part {
  bool is_tail;       // log of P(T > t), else log of P(0 < T < t)
  double log_part;
  double log_density;  // of T at t
};

/// The degrees of freedom above which the expansion about the normal is used.
inline constexpr double many_degrees = 1e4;

/// t - z in powers of 1/dof, z the normal deviate of the same probability.
///   [Fisher & Cornish, Technometrics 2, 1960; Abramowitz & Stegun 26.7.5]
inline double student_excess(double z, double dof) noexcept {
  double const y = z * z;
  double const r = 1.0 / dof;
  double const g1 = (y + 1.0) / 4.0;
  double const g2 = ((5.0 * y + 16.0) * y + 3.0) / 96.0;
  double const g3 = (((3.0 * y + 19.0) * y + 17.0) * y - 15.0) / 384.0;
  double const g4 = ((((79.0 * y + 776.0) * y + 1482.0) * y - 1920.0) * y - 945.0) / 92160.0;
  return z * r * (g1 + r * (g2 + r * (g3 + r * g4)));
}

inline student_part student_at(double t, double dof) noexcept {
  double const a = 0.5 * dof;
  double const ratio = t * t / dof;  // x = 1/(1 + ratio), 1 - x = ratio/(1 + ratio)
  double const log_x = -portable_log1p(ratio);
  constexpr double log_pi = 1.1447298858494002;
  double const log_peak = log_gamma_step(a) - 0.5 * (log_pi + portable_log(dof));
  student_part part{};
  part.log_density = log_peak + (a + 0.5) * log_x;
  // x^a (1 - x)^(1/2) / B(a, 1/2) = t f(t)
  double const log_front = portable_log(t) + part.log_density;
  double const x = 1.0 / (1.0 + ratio);
  part.is_tail = ratio > 1.5 / (a + 1.0);
  if (part.is_tail)
    part.log_part = log_front - portable_log(dof) + portable_log(beta_fraction(a, 0.5, x));
  else
    part.log_part = log_front + portable_log(beta_fraction(0.5, a, ratio * x));
  return part;
}

/// P(T > t) for Student's t, accurate in the upper tail.
/// @pre dof > 0, any real number
inline double student_upper(double t, double dof) noexcept {
  if (t == 0.0) return 0.5;
  if (t < 0.0) return 1.0 - student_upper(-t, dof);
  if (dof > many_degrees && t * t < dof / 50.0) {
    double z = t;  // invert the expansion by Newton steps on its leading term
    for (int step = 0; step < 50; ++step) {
      double const miss = z + student_excess(z, dof) - t;
      double const change = miss / (1.0 + (3.0 * z * z + 1.0) / (4.0 * dof));
      z -= change;
      if (change < 1e-15 * z && -change < 1e-15 * z) break;
    }
    return normal_upper(z);
  }
  if (t > 1e150) {
    if (dof > 3.0) return 0.0;
    double const a = 0.5 * dof;  // far tail: a pure power
    return portable_exp(log_gamma_step(a) - 0.5 * 1.1447298858494002 + (a - 1.0) * portable_log(dof) -
                        dof * portable_log(t));
  }
  student_part const part = student_at(t, dof);
  double const p = portable_exp(part.log_part);
  return part.is_tail ? p : 0.5 - p;
}

/// P(T < t) for Student's t, accurate in the lower tail.
inline double student_cdf(double t, double dof) noexcept { return student_upper(-t, dof); }

/// t with P(T > t) = q for Student's t: relative error below 1e-10, the degrees of
/// freedom any positive real number. Where the deviate is out of range or the
/// degrees of freedom are not positive, the largest double.
///   Newton's method for the logarithm of the probability as a function of
///   log t, which is concave; from 10 000 degrees the expansion about the normal.
/// @pre 0 < q < 1
/// Cost  a few microseconds.
inline double student_upper_quantile(double q, double dof) noexcept {
  constexpr double largest = std::numeric_limits<double>::max();
  if (q == 0.5) return 0.0;
  if (q > 0.5) return -student_upper_quantile(1.0 - q, dof);
  if (is_nan(dof) || !(dof > 0.0)) return largest;
  double const z = normal_upper_quantile(q);
  if (dof > many_degrees && z * z < dof / 100.0) return z + student_excess(z, dof);

  double const a = 0.5 * dof;
  double const log_q = portable_log(q);
  double const log_middle = portable_log(0.5 - q);
  // where the tail is a pure power: an upper bound of the answer, exact far out
  double const log_power = (log_gamma_step(a) - 0.5 * 1.1447298858494002 + (a - 1.0) * portable_log(dof) - log_q) / dof;
  double const log_scale = 0.5 * portable_log(dof);
  if (log_power > 709.7) return largest;
  if (log_power - log_scale > 18.5) return portable_exp(log_power);
  double log_t = log_power;
  if (dof > 2.0) {
    double const guess = portable_log(z + student_excess(z, dof));
    if (guess < log_t) log_t = guess;
  }
  double last = largest;
  for (int step = 0; step < 100; ++step) {
    double const t = portable_exp(log_t);
    student_part const part = student_at(t, dof);
    double change;  // by which log t is too large
    if (part.is_tail)
      change = (log_q - part.log_part) / portable_exp(log_t + part.log_density - part.log_part);
    else
      change = (part.log_part - log_middle) / portable_exp(log_t + part.log_density - part.log_part);
    log_t -= change;
    double const size = change < 0.0 ? -change : change;
    if (size < 1e-14 || (size < 1e-11 && size >= last)) break;
    last = size;
  }
  return portable_exp(log_t);
}

/// t with P(T < t) = p for Student's t. For p near 1 say
/// `student_upper_quantile(1 - p, dof)`, which keeps the tail.
inline double student_quantile(double p, double dof) noexcept { return -student_upper_quantile(p, dof); }

}  // namespace steelyard::inline v1::detail
