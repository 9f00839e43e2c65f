// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <limits>
#include <string>
#include <string_view>

#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `lognormal_noise`.
class lognormal_instrument : public scalar_instrument<lognormal_instrument> {
 public:
  explicit lognormal_instrument(double log_sd)
      : log_sd_(detail::positive("lognormal_noise", "a standard deviation of the logarithm", log_sd)),
        log_log_sd_(detail::portable_log(log_sd)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "lognormal_noise"; }
  [[nodiscard]] double lowest_reading() const noexcept { return std::numeric_limits<double>::min(); }
  [[nodiscard]] std::string shows() const { return "numbers above 0"; }
  [[nodiscard]] double admit(double truth) const { return detail::truth_from_zero(name(), truth); }

  [[nodiscard]] double log_density(double x, double truth) const {
    if (!(truth > 0.0) || !(x > 0.0)) return detail::impossible;
    return detail::log_normal_density(away(x, truth)) - log_log_sd_ - detail::portable_log(x);
  }
  [[nodiscard]] double log_below(double x, double truth) const {
    if (!(x > 0.0)) return detail::impossible;
    return truth > 0.0 ? detail::log_normal_above(-away(x, truth)) : 0.0;
  }
  [[nodiscard]] double log_above(double x, double truth) const {
    if (!(x > 0.0)) return 0.0;
    return truth > 0.0 ? detail::log_normal_above(away(x, truth)) : detail::impossible;
  }
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    if (!(c.lower > 0.0)) return log_below(c.upper, truth);
    if (!(truth > 0.0)) return detail::impossible;
    double const ratio = c.half / c.centre;  // log(centre) + log(1 -+ ratio)
    double const middle = 0.5 * detail::portable_log1p(-ratio * ratio) / log_sd_ + away(c.centre, truth);
    double const half = 0.5 * (detail::portable_log1p(ratio) - detail::portable_log1p(-ratio));
    return detail::log_normal_within(
        {away(c.lower, truth), away(c.upper, truth), middle, detail::deviate(half, 0.0, log_sd_), false});
  }
  [[nodiscard]] double fake(double truth, draws& d) const {
    return truth * detail::portable_exp(log_sd_ * d.normal());
  }

 private:
  [[nodiscard]] double away(double x, double truth) const {
    return detail::deviate(detail::log_ratio(x, truth), 0.0, log_sd_);
  }

  double log_sd_;
  double log_log_sd_;
};

/// Lognormal noise: the reading is the truth times e^(log_sd Z), Z standard
/// normal, so the truth is its median; for small log_sd a share of error.
///   log density = -(log(reading / truth) / log_sd)^2 / 2 - log(log_sd) - log(2 pi)/2 - log(reading)
/// @throws bad_argument unless log_sd is finite and above 0
inline lognormal_instrument lognormal_noise(double log_sd) { return lognormal_instrument(log_sd); }

}  // namespace steelyard::inline v1
