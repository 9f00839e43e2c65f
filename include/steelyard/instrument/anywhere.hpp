// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <string>
#include <string_view>

#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `anywhere`.
class anywhere_instrument : public scalar_instrument<anywhere_instrument> {
 public:
  anywhere_instrument(double lower, double upper)
      : lower_(lower),
        upper_(upper),
        log_width_(detail::portable_log(detail::positive("anywhere", "a width (upper - lower)", upper - lower))) {}

  [[nodiscard]] std::string_view name() const noexcept { return "anywhere"; }
  [[nodiscard]] double lowest_reading() const noexcept { return lower_; }
  [[nodiscard]] double highest_reading() const noexcept { return upper_; }
  [[nodiscard]] std::string shows() const {
    return "numbers from " + detail::plain_number(lower_) + " to " + detail::plain_number(upper_);
  }

  [[nodiscard]] double log_density(double x, double /*truth*/) const {
    return x >= lower_ && x <= upper_ ? -log_width_ : detail::impossible;
  }
  [[nodiscard]] double log_below(double x, double /*truth*/) const { return log_part(lower_, x); }
  [[nodiscard]] double log_above(double x, double /*truth*/) const { return log_part(x, upper_); }
  [[nodiscard]] double log_within(cell const& c, double /*truth*/) const {
    if (c.lower >= lower_ && c.upper <= upper_) return detail::portable_log(2.0 * c.half) - log_width_;
    return log_part(c.lower, c.upper);
  }
  [[nodiscard]] double fake(double /*truth*/, draws& d) const { return d.uniform(lower_, upper_); }

 private:
  [[nodiscard]] double log_part(double from, double to) const {
    double const length = std::min(to, upper_) - std::max(from, lower_);
    if (!(length > 0.0)) return detail::impossible;
    return length >= upper_ - lower_ ? 0.0 : detail::portable_log(length) - log_width_;
  }

  double lower_;
  double upper_;
  double log_width_;
};

/// A reading that says nothing about the truth: anything on the instrument's
/// scale is equally likely. The usual wide part of `with_outliers`.
/// @throws bad_argument unless lower < upper, both finite
inline anywhere_instrument anywhere(double lower, double upper) { return {lower, upper}; }

}  // namespace steelyard::inline v1
