// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <string>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/student.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>

namespace steelyard::inline v1::proof {

struct agreement_options {
  double false_alarm = 1e-4;  ///< how often a right answer may fail the check
  double difference = 0.0;    ///< a difference the check must be able to see; 0: none stated
};

namespace detail {

inline double size_of(double x) { return x < 0.0 ? -x : x; }

/// @throws bad_argument for a rate outside (0, 1), a difference below zero or not finite.
inline void check_options(agreement_options const& options) {
  checked_rate("agrees", options.false_alarm);
  if (!up::is_finite(options.difference) || options.difference < 0.0)
    throw bad_argument("agrees: the difference to be seen, " + up::plain_number(options.difference) +
                       ", must be zero or a positive finite number");
}

/// Terms behind an error bar below which no check is certified: five for each power of ten of the false-alarm rate.
inline double terms_needed(double rate) { return 5.0 * std::log10(1.0 / rate); }

/// Two numbers with standard error `se` between them on `dof` degrees of freedom: Student's test of no difference.
///   A difference is seen nine times in ten where it exceeds the limit by the 90 % point of t.
struct gap {
  double difference = 0.0;
  double se = 0.0;
  double dof = 0.0;
  double rounding = 0.0;   ///< differences up to here are none
  bool trusted = true;     ///< false: an error bar that is broken
};
inline check gap_check(gap const& g, std::string const& what, agreement_options const& options) {
  double const rate = options.false_alarm, size = size_of(g.difference);
  if (!(g.se > 0.0)) {
    if (size <= g.rounding) return {outcome::passed, what + " agree exactly; neither carries an error"};
    return {outcome::cannot_certify, what + " differ by " + up::plain_number(g.difference) +
                                         ", and no standard error is defined: cannot certify"};
  }
  std::string const apart = what + " are " + up::short_number(size / g.se) + " standard errors apart";
  if (!g.trusted) return {outcome::cannot_certify, apart + ", but the error bar is broken: cannot certify"};
  if (g.dof + 1.0 < terms_needed(rate))
    return {outcome::cannot_certify, apart + ", but only " + up::short_number(g.dof + 1.0) +
                                         " terms carry the error bar and a false-alarm rate of " +
                                         up::short_number(rate) + " wants " + up::short_number(terms_needed(rate)) +
                                         ": cannot certify"};
  double const limit = up::student_upper_quantile(0.5 * rate, g.dof);
  double const visible = (limit + up::student_upper_quantile(0.1, g.dof)) * g.se;
  std::string const sight = " (limit " + up::short_number(limit) + "; a difference of " + up::short_number(visible) +
                            " would be seen nine times in ten)";
  if (size > limit * g.se) return {outcome::failed, apart + sight};
  if (options.difference > 0.0 && options.difference < visible)
    return {outcome::cannot_certify,
            apart + sight + ", so one of " + up::short_number(options.difference) + " could go unseen: cannot certify"};
  return {outcome::passed, apart + sight};
}

/// Differences between a and b that rounding alone may make.
inline double rounding_of(double a, double b) { return 1e-13 * (size_of(a) > size_of(b) ? size_of(a) : size_of(b)); }

}  // namespace detail

/// Whether an estimate agrees with a known truth, at a stated false-alarm rate: Student's t on its degrees of freedom.
/// Where an event was never or always seen, the one-sided limit decides.
/// Assumes  a normal error: with fewer than five terms for each power of ten of the rate, the check cannot certify.
/// @throws bad_argument for a truth that is not finite, or options out of range.
[[nodiscard]] inline check agrees(estimate const& e, double truth, agreement_options const& options = {}) {
  detail::check_options(options);
  if (!detail::up::is_finite(truth))
    throw bad_argument("agrees: the truth, " + detail::up::plain_number(truth) + ", must be a finite number");
  if (!detail::up::is_finite(e.value)) return {outcome::failed, "the estimate is not a finite number"};
  if (e.never_seen() || e.always_seen()) {
    interval const limits = e.error_interval(1.0 - options.false_alarm);
    std::string const seen =
        e.never_seen()
            ? "the event was never seen, which leaves at most " + detail::up::short_number(limits.upper)
            : "the event was always seen, which leaves at least 1 - " + detail::up::short_number(1.0 - limits.lower);
    if (truth < limits.lower || truth > limits.upper)
      return {outcome::failed, seen + "; the truth is " + detail::up::plain_number(truth)};
    if (truth == e.value) return {outcome::passed, seen + ", as the truth has it"};
    return {outcome::cannot_certify, seen + ": cannot certify"};
  }
  return detail::gap_check({e.value - truth, e.standard_error, e.degrees_of_freedom,
                            detail::rounding_of(e.value, truth), e.verdict() != verdict::broken},
                           "the estimate and the truth", options);
}

/// Whether two estimates from independent runs agree: Welch's degrees of freedom.      [Welch, Biometrika 34, 1947, 28]
[[nodiscard]] inline check agrees(estimate const& a, estimate const& b, agreement_options const& options = {}) {
  detail::check_options(options);
  if (!detail::up::is_finite(a.value) || !detail::up::is_finite(b.value))
    return {outcome::failed, "one of the two estimates is not a finite number"};
  if (a.never_seen() || a.always_seen() || b.never_seen() || b.always_seen())
    return {outcome::cannot_certify, "an event was never or always seen in one of the two runs: cannot certify"};
  double const va = a.standard_error * a.standard_error, vb = b.standard_error * b.standard_error;
  double const bottom = (a.degrees_of_freedom > 0.0 ? va * (va / a.degrees_of_freedom) : 0.0) +
                        (b.degrees_of_freedom > 0.0 ? vb * (vb / b.degrees_of_freedom) : 0.0);
  auto const stands = [](estimate const& e) { return e.standard_error == 0.0 || e.verdict() != verdict::broken; };
  return detail::gap_check(
      {a.value - b.value, std::sqrt(va + vb), bottom > 0.0 ? (va + vb) * ((va + vb) / bottom) : 0.0,
       detail::rounding_of(a.value, b.value), stands(a) && stands(b)},
      "the two estimates", options);
}

}  // namespace steelyard::inline v1::proof
