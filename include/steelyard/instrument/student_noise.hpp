// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>
#include <string_view>

#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/base/student.hpp>
#include <steelyard/draw/inversion.hpp>
#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// Student's t: density and tail, for 1e-2 <= dof <= 1e8.
class student_law {
 public:
  explicit student_law(double dof)
      : dof_(dof),
        root_dof_(portable_sqrt(dof)),  // log Gamma((dof+1)/2) - log Gamma(dof/2) - log(pi dof)/2
        log_peak_(-portable_log(boost::math::tgamma_delta_ratio(0.5 * dof, 0.5, quiet{})) -
                  0.5 * (portable_log(dof) + 1.1447298858494001741)) {}

  [[nodiscard]] double log_density(double z) const {
    double const r = std::abs(z) / root_dof_;
    double const bend = r < 1e8 ? portable_log1p(r * r) : 2.0 * portable_log(r);
    return log_peak_ - 0.5 * (dof_ + 1.0) * bend;
  }
  /// log P(T > z) = log of half I_x(dof/2, 1/2), x = dof / (dof + z^2)
  [[nodiscard]] double log_above(double z) const {
    if (z < 0.0) return portable_log1p(-portable_exp(log_above(-z)));
    double const r = z / root_dof_;
    if (r > 1e8)  // I_x = x^a / (a B(a, 1/2)) to the last digit, a = dof/2; z times the density over dof
      return log_density(z) + portable_log(z) - portable_log(dof_);
    double const square = r * r;
    return log_beta_below(0.5 * dof_, 0.5, 1.0 / (1.0 + square), square / (1.0 + square)) - 0.69314718055994530942;
  }
  /// log P(c.lower < T < c.upper): both ends in the same tail, both tails taken
  /// from 1, or by quadrature where those would cancel.
  [[nodiscard]] double log_within(cell const& c) const {
    if (c.lower < 0.0 && c.upper > 0.0) {
      double const outside = portable_exp(log_above(c.upper)) + portable_exp(log_above(-c.lower));
      if (outside < 0.9) return portable_log1p(-outside);
    } else {
      double const near = log_above(std::min(std::abs(c.lower), std::abs(c.upper)));
      double const far = log_above(std::max(std::abs(c.lower), std::abs(c.upper)));
      if (far - near < -0.1 * std::min(dof_, 1.0)) return log_difference(near, far);
    }
    return log_integral([this](double z) { return log_density(z); }, c.centre, c.half);
  }

 private:
  double dof_;
  double root_dof_;
  double log_peak_;
};

}  // namespace detail

/// Made by `student_noise`.
class student_instrument : public scalar_instrument<student_instrument> {
 public:
  student_instrument(double scale, double dof)
      : scale_(detail::positive("student_noise", "a scale", scale)),
        dof_(checked_dof(dof)),
        log_scale_(detail::portable_log(scale)),
        law_(dof) {}

  [[nodiscard]] std::string_view name() const noexcept { return "student_noise"; }
  [[nodiscard]] double scale() const noexcept { return scale_; }

  [[nodiscard]] double log_density(double x, double truth) const {
    return law_.log_density(detail::deviate(x, truth, scale_)) - log_scale_;
  }
  [[nodiscard]] double log_below(double x, double truth) const {
    return law_.log_above(detail::deviate(truth, x, scale_));
  }
  [[nodiscard]] double log_above(double x, double truth) const {
    return law_.log_above(detail::deviate(x, truth, scale_));
  }
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    return law_.log_within(detail::deviates(c, truth, scale_));
  }
  /// One word, rising with it.
  [[nodiscard]] double fake(double truth, draws& d) const {
    detail::tail const t = detail::tail_from_word(d());
    double const z = detail::student_upper_quantile(t.probability, dof_);
    double const error = std::min(z, 1e300 / std::max(scale_, 1.0)) * scale_;
    return t.lower ? truth - error : truth + error;
  }

 private:
  static double checked_dof(double dof) {
    if (detail::is_finite(dof) && dof >= 0.01 && dof <= 1e8) return dof;
    throw bad_argument("student_noise: " + detail::plain_number(dof) +
                       " degrees of freedom are not allowed; they must lie between 0.01 and 1e8 "
                       "(normal_noise is the limit of many)");
  }

  double scale_;
  double dof_;
  double log_scale_;
  detail::student_law law_;
};

/// Student's t noise: normal in the middle, with tails that take a gross error
/// now and then in their stride; the fewer degrees of freedom, the longer.
///   log density = log t_dof((reading - truth) / scale) - log(scale)
/// The scale is not the standard deviation: that is scale sqrt(dof / (dof - 2)), dof > 2.
/// @throws bad_argument unless scale is above 0 and dof between 0.01 and 1e8
inline student_instrument student_noise(double scale, double dof) { return {scale, dof}; }

}  // namespace steelyard::inline v1
