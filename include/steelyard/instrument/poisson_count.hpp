// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string_view>

#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/counting.hpp>

namespace steelyard::inline v1 {

/// What is counted besides, and for how long: expected count = background + exposure truth.
struct count_setting {
  double background = 0.0;  ///< counts expected where the truth is 0
  double exposure = 1.0;    ///< time, area, efficiency: counts expected for a truth of 1
};

/// Made by `poisson_count`.
class poisson_instrument : public detail::counting<poisson_instrument> {
 public:
  explicit poisson_instrument(count_setting setting) : setting_(setting) {
    detail::not_negative("poisson_count", "a background", setting.background);
    detail::positive("poisson_count", "an exposure", setting.exposure);
  }

  [[nodiscard]] std::string_view name() const noexcept { return "poisson_count"; }
  [[nodiscard]] double admit(double truth) const { return detail::truth_from_zero(name(), truth); }

  [[nodiscard]] double mean(double truth) const { return setting_.background + setting_.exposure * truth; }
  [[nodiscard]] double sd(double truth) const { return detail::portable_sqrt(mean(truth)); }
  [[nodiscard]] double log_mass(double k, double truth) const { return detail::log_poisson(k, mean(truth)); }
  [[nodiscard]] double log_at_most(double k, double truth) const {
    return detail::log_gamma_above(k + 1.0, mean(truth));
  }
  [[nodiscard]] double log_at_least(double k, double truth) const { return detail::log_gamma_below(k, mean(truth)); }

 private:
  count_setting setting_;
};

/// Independent events counted; the truth is the expected count, or the rate
/// where an exposure is given.
///   log P(n) = n log(m) - m - log(n!),  m = background + exposure truth
/// @throws bad_argument unless background >= 0 and exposure > 0
/// Assumes  no event hides another (see dead_time_counter) and none brings others.
inline poisson_instrument poisson_count(count_setting setting = {}) { return poisson_instrument(setting); }

}  // namespace steelyard::inline v1
