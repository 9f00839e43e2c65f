// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string>
#include <string_view>

#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// sqrt(a^2 + b^2) for a, b >= 0, without overflow
inline double root_sum_square(double a, double b) noexcept {
  double const high = a > b ? a : b, low = a > b ? b : a;
  if (!(high > 0.0)) return 0.0;
  double const ratio = low / high;
  return high * portable_sqrt(1.0 + ratio * ratio);
}

/// An instrument whose reading is normal about the truth. `Self` provides
/// `sd(truth)` and `log_sd(truth)`; where the standard deviation is 0 it shows
/// the truth itself.
template <class Self>
class gaussian : public scalar_instrument<Self> {
 public:
  [[nodiscard]] double log_density(double x, double truth) const {
    double const sd = self().sd(truth);
    if (sd > 0.0) return log_normal_density(deviate(x, truth, sd)) - self().log_sd(truth);
    if (x == truth)
      throw bad_readout(std::string(self().name()) +
                        ": reading and true value are both 0, where it has no noise and the density is unbounded; "
                        "give it an absolute part, two_part_noise({.absolute, .relative})");
    return impossible;
  }
  [[nodiscard]] double log_below(double x, double truth) const { return log_tail(truth, x, truth); }
  [[nodiscard]] double log_above(double x, double truth) const { return log_tail(x, truth, truth); }
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    double const sd = self().sd(truth);
    if (sd > 0.0) return log_normal_within(deviates(c, truth, sd));
    return c.lower <= truth && truth <= c.upper ? 0.0 : impossible;
  }
  [[nodiscard]] double fake(double truth, draws& d) const { return d.normal(truth, self().sd(truth)); }

 protected:
  gaussian() = default;

 private:
  [[nodiscard]] Self const& self() const { return static_cast<Self const&>(*this); }
  [[nodiscard]] double log_tail(double from, double to, double truth) const {
    double const sd = self().sd(truth);
    if (sd > 0.0) return log_normal_above(deviate(from, to, sd));
    return from < to ? 0.0 : impossible;
  }
};

}  // namespace detail

/// Made by `normal_noise`.
class normal_instrument : public detail::gaussian<normal_instrument> {
 public:
  explicit normal_instrument(double sd)
      : sd_(detail::positive("normal_noise", "a standard deviation", sd)), log_sd_(detail::portable_log(sd)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "normal_noise"; }
  [[nodiscard]] double scale() const noexcept { return sd_; }
  [[nodiscard]] double sd(double /*truth*/) const noexcept { return sd_; }
  [[nodiscard]] double log_sd(double /*truth*/) const noexcept { return log_sd_; }

 private:
  double sd_;
  double log_sd_;
};

/// Normal noise: the reading is normal about the truth with standard deviation `sd`.
///   log density = -(reading - truth)^2 / (2 sd^2) - log(sd) - log(2 pi)/2
/// @throws bad_argument unless sd is finite and above 0
/// Assumes  no gross errors: one wild reading decides everything (see with_outliers).
inline normal_instrument normal_noise(double sd) { return normal_instrument(sd); }

}  // namespace steelyard::inline v1
