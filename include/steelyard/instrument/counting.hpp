// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>
#include <string>

#include <steelyard/base/normal.hpp>
#include <steelyard/draw/inversion.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1::detail {

/// An instrument that shows a whole number from 0 up. `Self` provides, for a
/// whole k within its range,
///   log_mass(k, truth), log_at_most(k, truth), log_at_least(k, truth),
///   mean(truth), sd(truth): where a search for a quantile starts,
/// and `highest_reading()` where there is one.
template <class Self>
class counting : public scalar_instrument<Self> {
 public:
  static constexpr scale_of scale_kind = scale_of::whole;

  [[nodiscard]] double lowest_reading() const { return 0.0; }
  [[nodiscard]] double highest_reading() const { return 9007199254740992.0; }  // 2^53: beyond, doubles skip numbers
  [[nodiscard]] std::string shows() const { return "whole numbers from 0 up"; }
  [[nodiscard]] double scale() const { return 1.0; }

  [[nodiscard]] bool can_show(shown const& reading) const {
    bool const limit = reading.what() == shown::kind::under || reading.what() == shown::kind::over;
    return scalar_instrument<Self>::can_show(reading) &&
           (limit || std::ceil(reading.lower()) <= std::floor(reading.upper()));
  }

  [[nodiscard]] double log_density(double x, double truth) const {
    if (x < 0.0 || x > self().highest_reading() || x != std::floor(x)) return impossible;
    return self().log_mass(x, truth);
  }
  [[nodiscard]] double log_below(double x, double truth) const {
    double const k = std::ceil(x) - 1.0;
    return k < 0.0 ? impossible : k >= self().highest_reading() ? 0.0 : self().log_at_most(k, truth);
  }
  [[nodiscard]] double log_above(double x, double truth) const {
    double const k = std::floor(x) + 1.0;
    return k > self().highest_reading() ? impossible : k <= 0.0 ? 0.0 : self().log_at_least(k, truth);
  }
  /// Up to 256 terms one by one; more from the tail that holds less.
  [[nodiscard]] double log_within(cell const& c, double truth) const {
    double const first = std::max(std::ceil(c.lower), 0.0);
    double const last = std::min(std::floor(c.upper), self().highest_reading());
    if (first > last) return impossible;
    if (last - first < 256.0) {
      double sum = self().log_mass(first, truth);
      for (double k = first + 1.0; k <= last; k += 1.0) sum = log_sum(sum, self().log_mass(k, truth));
      return std::min(sum, 0.0);
    }
    double const from_first = log_above(first - 1.0, truth), to_last = log_below(last + 1.0, truth);
    return from_first < to_last ? log_difference(from_first, log_above(last, truth))
                                : log_difference(to_last, log_below(first, truth));
  }

  /// The smallest k with P(N <= k) >= u: one word, rising with it.
  [[nodiscard]] std::int64_t fake(double truth, draws& d) const {
    tail const t = tail_from_word(d());
    double const bound = portable_log(t.probability), top = self().highest_reading();
    auto const reached = [&](double k) {
      return t.lower ? self().log_at_most(k, truth) >= bound : log_above(k, truth) <= bound;
    };
    double const z = normal_tail_quantile(t.probability), sd = self().sd(truth);
    double const guess = std::floor(self().mean(truth) + (t.lower ? z : -z) * sd);
    double step = std::ceil(0.1 * sd + 1.0), low = std::min(std::max(guess, 0.0), top), high = low;
    if (reached(high)) {
      do {  // low is -1 or not reached
        high = low;
        low = std::max(high - step, -1.0);
        step += step;
      } while (low >= 0.0 && reached(low));
    } else {
      do {
        low = high;
        high = std::min(low + step, top);
        step += step;
      } while (high < top && !reached(high));
    }
    while (high - low > 1.0) {
      double const middle = std::floor(low + 0.5 * (high - low));
      (reached(middle) ? high : low) = middle;
    }
    return static_cast<std::int64_t>(high);
  }

 protected:
  counting() = default;

 private:
  [[nodiscard]] Self const& self() const { return static_cast<Self const&>(*this); }
};

}  // namespace steelyard::inline v1::detail
