// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <string>
#include <string_view>

#include <steelyard/base/count.hpp>
#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/counting.hpp>

namespace steelyard::inline v1 {

/// Made by `binomial_count`.
class binomial_instrument : public detail::counting<binomial_instrument> {
 public:
  explicit binomial_instrument(count trials) : trials_(static_cast<double>(trials.value())) {
    if (trials_ < 1.0 || trials_ > 9007199254740992.0)
      throw bad_argument("binomial_count: " + std::to_string(trials.value()) +
                         " trials are not allowed; there must be 1 to 2^53");
  }

  [[nodiscard]] std::string_view name() const noexcept { return "binomial_count"; }
  [[nodiscard]] double highest_reading() const { return trials_; }
  [[nodiscard]] std::string shows() const { return "whole numbers from 0 to " + detail::plain_number(trials_); }
  [[nodiscard]] double admit(double truth) const { return detail::truth_as_share(name(), truth); }

  [[nodiscard]] double mean(double p) const { return trials_ * p; }
  [[nodiscard]] double sd(double p) const { return detail::portable_sqrt(trials_ * p * (1.0 - p)); }
  [[nodiscard]] double log_mass(double k, double p) const { return detail::log_binomial(k, trials_ - k, p, 1.0 - p); }
  [[nodiscard]] double log_at_most(double k, double p) const {
    return k >= trials_ ? 0.0 : detail::log_beta_below(trials_ - k, k + 1.0, 1.0 - p, p);
  }
  [[nodiscard]] double log_at_least(double k, double p) const {
    return k <= 0.0 ? 0.0 : detail::log_beta_below(k, trials_ - k + 1.0, p, 1.0 - p);
  }

 private:
  double trials_;
};

/// How many of `trials` independent tries came out; the truth is the
/// probability p of one.
///   log P(n) = log C(trials, n) + n log(p) + (trials - n) log(1 - p)
/// @throws bad_argument for no trials
/// Assumes  every try has the same probability, whatever the others did.
inline binomial_instrument binomial_count(count trials) { return binomial_instrument(trials); }

}  // namespace steelyard::inline v1
