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
  /// Areas of trapezia: on one side of the truth 2h (1 - m), else one for each side.
  [[nodiscard]] double log_around(double c, double h, double truth) const {
    double const m = std::abs(detail::deviate(c, truth, half_width_)), w = detail::deviate(h, 0.0, half_width_);
    if (m + w >= 1.0 && m >= w) return log_tail(m - w);
    if (m >= w) return detail::portable_log(2.0 * w * (1.0 - m));
    return detail::portable_log(from_truth(w + m) + from_truth(w - m));
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
