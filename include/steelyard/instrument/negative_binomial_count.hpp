// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string_view>

#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/counting.hpp>

namespace steelyard::inline v1 {

/// Made by `negative_binomial_count`.
class negative_binomial_instrument : public detail::counting<negative_binomial_instrument> {
 public:
  explicit negative_binomial_instrument(double size)
      : size_(detail::positive("negative_binomial_count", "a size", size)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "negative_binomial_count"; }
  [[nodiscard]] double admit(double truth) const { return detail::truth_from_zero(name(), truth); }

  [[nodiscard]] double mean(double truth) const { return truth; }
  [[nodiscard]] double sd(double truth) const { return detail::portable_sqrt(truth + truth * truth / size_); }
  [[nodiscard]] double log_mass(double k, double truth) const {
    double const whole = size_ + truth;
    return detail::log_binomial(size_, k, size_ / whole, truth / whole) - detail::portable_log1p(k / size_);
  }
  [[nodiscard]] double log_at_most(double k, double truth) const {
    double const whole = size_ + truth;
    return detail::log_beta_below(size_, k + 1.0, size_ / whole, truth / whole);
  }
  [[nodiscard]] double log_at_least(double k, double truth) const {
    double const whole = size_ + truth;
    return k <= 0.0 ? 0.0 : detail::log_beta_below(k, size_, truth / whole, size_ / whole);
  }

 private:
  double size_;
};

/// Counts that scatter more than Poisson ones: negative binomial with the truth
/// as mean and variance truth + truth^2 / size. A small size means much extra
/// scatter; a large one comes back to Poisson.
///   P(n) = Gamma(n + size) / (n! Gamma(size)) (size/(size+m))^size (m/(size+m))^n,  m = truth
/// @throws bad_argument unless size is finite and above 0 (it need not be whole)
inline negative_binomial_instrument negative_binomial_count(double size) { return negative_binomial_instrument(size); }

}  // namespace steelyard::inline v1
