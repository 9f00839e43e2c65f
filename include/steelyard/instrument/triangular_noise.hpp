// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>
#include <string_view>

#include <steelyard/draw/inversion.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `triangular_noise`.
class triangular_instrument : public scalar_instrument<triangular_instrument> {
 public:
  explicit triangular_instrument(double half_width)
      : half_width_(detail::positive("triangular_noise", "a half width", half_width)),
        log_half_width_(detail::portable_log(half_width)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "triangular_noise"; }
  [[nodiscard]] double scale() const noexcept { return half_width_; }

  [[nodiscard]] double log_density(double x, double truth) const {
    double const z = std::abs(detail::deviate(x, truth, half_width_));
    return z < 1.0 ? detail::portable_log(1.0 - z) - log_half_width_ : detail::impossible;
  }
  [[nodiscard]] double log_below(double x, double truth) const {
    return log_tail(detail::deviate(truth, x, half_width_));
  }
  [[nodiscard]] double log_above(double x, double truth) const {
    return log_tail(detail::deviate(x, truth, half_width_));
  }
  /// Areas of trapezia: one on either side of the truth, or 2h (1 - m) on one side.
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    cell const z = detail::deviates(c, truth, half_width_);
    if (z.lower < 0.0 && z.upper > 0.0) return detail::portable_log(from_truth(z.upper) + from_truth(-z.lower));
    if (z.upper >= 1.0) return log_tail(z.lower);
    if (z.lower <= -1.0) return log_tail(-z.upper);
    return detail::portable_log(2.0 * z.half * (1.0 - std::abs(z.centre)));
  }
  [[nodiscard]] double fake(double truth, draws& d) const {
    detail::tail const t = detail::tail_from_word(d());
    double const z = detail::portable_sqrt(2.0 * t.probability) - 1.0;
    return truth + (t.lower ? z : -z) * half_width_;
  }

 private:
  static double from_truth(double z) {
    double const end = std::min(z, 1.0);
    return 0.5 * end * (2.0 - end);
  }
  static double log_tail(double z) {
    if (z >= 1.0) return detail::impossible;
    if (z <= -1.0) return 0.0;
    if (z >= 0.0) return detail::portable_log(0.5 * (1.0 - z) * (1.0 - z));
    return detail::portable_log1p(-0.5 * (1.0 + z) * (1.0 + z));
  }

  double half_width_;
  double log_half_width_;
};

/// Triangular noise: most likely at the truth, falling in straight lines to
/// nothing at truth -+ half_width; standard deviation half_width / sqrt(6)  [GUM 4.3.9].
/// @throws bad_argument unless half_width is finite and above 0
inline triangular_instrument triangular_noise(double half_width) { return triangular_instrument(half_width); }

}  // namespace steelyard::inline v1
