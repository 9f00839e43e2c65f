// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <string_view>

#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `uniform_tolerance`.
class uniform_instrument : public scalar_instrument<uniform_instrument> {
 public:
  explicit uniform_instrument(double half_width)
      : half_width_(detail::positive("uniform_tolerance", "a half width", half_width)),
        log_width_(detail::portable_log(2.0 * half_width)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "uniform_tolerance"; }
  [[nodiscard]] double scale() const noexcept { return half_width_; }

  [[nodiscard]] double log_density(double x, double truth) const {
    return x - truth <= half_width_ && truth - x <= half_width_ ? -log_width_ : detail::impossible;
  }
  [[nodiscard]] double log_below(double x, double truth) const { return log_part(half_width_ + (x - truth)); }
  [[nodiscard]] double log_above(double x, double truth) const { return log_part(half_width_ - (x - truth)); }
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    cell const away = c.from(truth);
    if (away.upper <= half_width_ && -away.lower <= half_width_) return log_part(2.0 * c.half);
    return log_part(std::min(away.upper, half_width_) + std::min(-away.lower, half_width_));
  }
  [[nodiscard]] double fake(double truth, draws& d) const {
    return d.uniform(truth - half_width_, truth + half_width_);
  }

 private:
  [[nodiscard]] double log_part(double length) const {
    if (!(length > 0.0)) return detail::impossible;
    return length >= 2.0 * half_width_ ? 0.0 : detail::portable_log(length) - log_width_;
  }

  double half_width_;
  double log_width_;
};

/// A tolerance and nothing else known: any reading from truth - half_width to
/// truth + half_width is equally likely, none beyond. Limits of a data sheet or
/// a certificate  [GUM 4.3.7].
/// @throws bad_argument unless half_width is finite and above 0
inline uniform_instrument uniform_tolerance(double half_width) { return uniform_instrument(half_width); }

}  // namespace steelyard::inline v1
