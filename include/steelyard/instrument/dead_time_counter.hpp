// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cmath>
#include <string>
#include <string_view>

#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/counting.hpp>

namespace steelyard::inline v1 {

/// How a counter counts, in one unit of time.
struct counter_setting {
  double dead_time = 0.0;      ///< blind after each registered event
  double counting_time = 1.0;  ///< from start to stop of the clock
  double background = 0.0;     ///< rate of events that come from elsewhere
};

/// Made by `dead_time_counter`.
class dead_time_instrument : public detail::counting<dead_time_instrument> {
 public:
  explicit dead_time_instrument(counter_setting setting) : setting_(setting) {
    detail::not_negative("dead_time_counter", "a dead time", setting.dead_time);
    detail::positive("dead_time_counter", "a counting time", setting.counting_time);
    detail::not_negative("dead_time_counter", "a background rate", setting.background);
  }

  [[nodiscard]] std::string_view name() const noexcept { return "dead_time_counter"; }
  /// One event more than there are dead times in the counting time.
  [[nodiscard]] double highest_reading() const {
    double const most = counting<dead_time_instrument>::highest_reading();
    return setting_.counting_time >= most * setting_.dead_time
               ? most
               : std::ceil(setting_.counting_time / setting_.dead_time);
  }
  [[nodiscard]] std::string shows() const {
    return "whole numbers from 0 to " + detail::plain_number(highest_reading());
  }
  [[nodiscard]] double admit(double truth) const { return detail::truth_from_zero(name(), truth); }

  [[nodiscard]] double mean(double truth) const {
    double const rate = setting_.background + truth;
    return setting_.counting_time * rate / (1.0 + rate * setting_.dead_time);
  }
  [[nodiscard]] double sd(double truth) const {
    double const live = 1.0 + (setting_.background + truth) * setting_.dead_time;
    return detail::portable_sqrt(mean(truth)) / live;
  }
  [[nodiscard]] double log_mass(double k, double truth) const {
    double const after = expected(k, truth);
    double const open = after > 0.0 ? detail::log_poisson(k, after) : detail::impossible;
    if (!(k > 0.0)) return open;
    return detail::log_sum(open, log_last(k, std::max(after, 0.0), expected(k - 1.0, truth)));
  }
  [[nodiscard]] double log_at_most(double k, double truth) const {
    return detail::log_gamma_above(k + 1.0, std::max(expected(k, truth), 0.0));
  }
  [[nodiscard]] double log_at_least(double k, double truth) const {
    return k <= 0.0 ? 0.0 : detail::log_gamma_below(k, std::max(expected(k - 1.0, truth), 0.0));
  }

 private:
  /// Events expected in the time that k whole dead times leave.
  [[nodiscard]] double expected(double k, double truth) const {
    return (setting_.background + truth) * (setting_.counting_time - k * setting_.dead_time);
  }
  /// log P(from < Gamma(k) <= to): the k-th event falls in the last dead time.
  static double log_last(double k, double from, double to) {
    if (!(to > from)) return detail::impossible;
    double const middle = 0.5 * (from + to), half = 0.5 * (to - from);
    auto const density = [k](double x) { return detail::log_poisson(k - 1.0, x); };
    if (half < 0.1 * middle && half * std::abs((k - 1.0) / middle - 1.0) < 0.5)
      return detail::log_integral(density, middle, half);
    bool const upper = from > k;
    double const more = upper ? detail::log_gamma_above(k, from) : detail::log_gamma_below(k, to);
    double const less = upper ? detail::log_gamma_above(k, to) : detail::log_gamma_below(k, from);
    if (less - more < -0.1) return detail::log_difference(more, less);
    return detail::log_integral(density, middle, half);
  }

  counter_setting setting_;
};

/// A counter that is blind for a fixed dead time after each registered event
/// and not prolonged by events in it (non-paralysable, type I), ready when the
/// clock starts. The truth is the true rate of events per unit of time.
///   P(N >= k) = P(Gamma(k) <= r (T - (k-1) tau)): k waiting times and k-1 dead times fit into T;
///   P(N = k) = Poisson(k; r (T - k tau)) + P(r (T - k tau) < Gamma(k) <= r (T - (k-1) tau)), r = background + truth
///   [Feller, On probability problems in the theory of counters, Courant volume, 1948;
///    Mueller, Nucl. Instrum. Methods 117, 1974, 401: the "ordinary" process; from memory]
/// @throws bad_argument unless dead time and background are >= 0 and the counting time > 0
/// Assumes  the counter is free at the start. Where a running counter is gated
///          it may be blind at first: then, for T long against tau, the mean is lower by (r tau / (1 + r tau))^2 / 2.
inline dead_time_instrument dead_time_counter(counter_setting setting) { return dead_time_instrument(setting); }

}  // namespace steelyard::inline v1
