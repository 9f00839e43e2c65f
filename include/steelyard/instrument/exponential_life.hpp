// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <string>
#include <string_view>

#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `exponential_life`.
class life_instrument : public scalar_instrument<life_instrument> {
 public:
  life_instrument() = default;

  [[nodiscard]] std::string_view name() const noexcept { return "exponential_life"; }
  [[nodiscard]] double lowest_reading() const noexcept { return 0.0; }
  [[nodiscard]] std::string shows() const { return "numbers from 0 up"; }
  [[nodiscard]] double admit(double truth) const { return detail::truth_from_zero(name(), truth); }

  [[nodiscard]] double log_density(double x, double rate) const {
    return x >= 0.0 ? detail::log_product(detail::portable_log(rate), -rate * x) : detail::impossible;
  }
  [[nodiscard]] double log_below(double x, double rate) const {
    return x > 0.0 ? detail::portable_log(-detail::portable_expm1(-rate * x)) : detail::impossible;
  }
  [[nodiscard]] double log_above(double x, double rate) const {
    return x > 0.0 ? std::max(-rate * x, detail::impossible) : 0.0;
  }
  [[nodiscard]] double log_within(cell const& c, double rate) const {
    if (c.lower <= 0.0) return log_below(c.upper, rate);
    return detail::log_product(-rate * c.lower, detail::portable_log(-detail::portable_expm1(-2.0 * rate * c.half)));
  }
  [[nodiscard]] double fake(double rate, draws& d) const {
    if (!(rate > 0.0)) detail::refuse_truth(name(), rate, "above 0 to draw a life");
    return d.exponential(rate);
  }
};

/// A life or a waiting time; the truth is the rate at which it ends (events per
/// unit of time), so 1/truth is the mean. One that has not ended after time t is
/// the reading `sy::over(t)`; one that ended between inspections `sy::within(a, b)`.
///   log density = log(rate) - rate reading
inline life_instrument exponential_life() { return {}; }

}  // namespace steelyard::inline v1
