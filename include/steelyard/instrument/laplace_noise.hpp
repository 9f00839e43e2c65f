// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>
#include <string_view>

#include <steelyard/draw/inversion.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `laplace_noise`.
class laplace_instrument : public scalar_instrument<laplace_instrument> {
 public:
  explicit laplace_instrument(double scale)
      : scale_(detail::positive("laplace_noise", "a scale", scale)),
        log_width_(detail::portable_log(scale) + log_two) {}

  [[nodiscard]] std::string_view name() const noexcept { return "laplace_noise"; }
  [[nodiscard]] double scale() const noexcept { return scale_; }

  [[nodiscard]] double log_density(double x, double truth) const {
    return -std::abs(detail::deviate(x, truth, scale_)) - log_width_;
  }
  [[nodiscard]] double log_below(double x, double truth) const { return log_tail(detail::deviate(truth, x, scale_)); }
  [[nodiscard]] double log_above(double x, double truth) const { return log_tail(detail::deviate(x, truth, scale_)); }
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    cell const z = detail::deviates(c, truth, scale_);
    if (z.lower < 0.0 && z.upper > 0.0)
      return detail::portable_log(-detail::portable_expm1(z.lower) - detail::portable_expm1(-z.upper)) - log_two;
    double const near = std::min(std::abs(z.lower), std::abs(z.upper));
    return -near + detail::portable_log(-detail::portable_expm1(-2.0 * z.half)) - log_two;
  }
  [[nodiscard]] double fake(double truth, draws& d) const {
    detail::tail const t = detail::tail_from_word(d());
    double const z = detail::portable_log(2.0 * t.probability);
    return truth + (t.lower ? z : -z) * scale_;
  }

 private:
  static constexpr double log_two = 0.69314718055994530942;
  static double log_tail(double z) {
    return z > 0.0 ? -z - log_two : detail::portable_log1p(-0.5 * detail::portable_exp(z));
  }

  double scale_;
  double log_width_;
};

/// Laplace (double exponential) noise: sharper at the truth and longer in the
/// tails than normal noise; standard deviation sqrt(2) scale.
///   log density = -|reading - truth| / scale - log(2 scale)
/// @throws bad_argument unless scale is finite and above 0
inline laplace_instrument laplace_noise(double scale) { return laplace_instrument(scale); }

}  // namespace steelyard::inline v1
