// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <string>

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

/// Two-sided Student test of a gap against zero.
///   t = gap / se on dof degrees of freedom; a stated difference can be seen if it exceeds the limit by the 90 %
///   point of t, so that nine in ten such differences are found.
inline check gap_check(double gap, double se, double dof, std::string const& what, agreement_options const& options) {
  double const rate = checked_rate("agrees", options.false_alarm);
  double const needed = 5.0 * std::log10(1.0 / rate);
  if (!(se > 0.0)) {
    if (gap == 0.0) return {outcome::passed, what + " agree exactly; neither carries an error"};
    return {outcome::cannot_certify, what + " differ by " + up::plain_number(gap) +
                                         ", and no standard error is defined: cannot certify"};
  }
  double const limit = dof > 0.0 ? up::student_upper_quantile(0.5 * rate, dof) : 0.0;
  double const off = (gap < 0.0 ? -gap : gap) / se;
  std::string const apart = what + " are " + up::short_number(off) + " standard errors apart";
  if (dof + 1.0 < needed)
    return {outcome::cannot_certify, apart + ", but only " + up::short_number(dof + 1.0) + " terms carry the error bar and a false-alarm rate of " +
                                         up::short_number(rate) + " wants " + up::short_number(needed) + ": cannot certify"};
  double const visible = (limit + up::student_upper_quantile(0.1, dof)) * se;
  std::string const sight = " (limit " + up::short_number(limit) + "; a difference of " + up::short_number(visible) +
                            " would be seen nine times in ten)";
  if (off > limit) return {outcome::failed, apart + sight};
  if (options.difference > 0.0 && options.difference < visible)
    return {outcome::cannot_certify, apart + sight + ", so one of " + up::short_number(options.difference) +
                                         " could go unseen: cannot certify"};
  return {outcome::passed, apart + sight};
}

}  // namespace detail

/// Whether an estimate agrees with a known truth, at a stated false-alarm rate: Student's t on its degrees of freedom.
/// Assumes  a normal error: five terms for each power of ten of the rate, or the check cannot certify.
[[nodiscard]] inline check agrees(estimate const& e, double truth, agreement_options const& options = {}) {
  return detail::gap_check(e.value - truth, e.standard_error, e.degrees_of_freedom, "the estimate and the truth", options);
}

/// Whether two independent estimates agree: Welch's degrees of freedom.   [Welch, Biometrika 34, 1947, 28]
[[nodiscard]] inline check agrees(estimate const& a, estimate const& b, agreement_options const& options = {}) {
  double const va = a.standard_error * a.standard_error, vb = b.standard_error * b.standard_error;
  double const bottom = (a.degrees_of_freedom > 0.0 ? va * va / a.degrees_of_freedom : 0.0) +
                        (b.degrees_of_freedom > 0.0 ? vb * vb / b.degrees_of_freedom : 0.0);
  double const dof = bottom > 0.0 ? (va + vb) * ((va + vb) / bottom) : 0.0;
  return detail::gap_check(a.value - b.value, std::sqrt(va + vb), dof, "the two estimates", options);
}

}  // namespace steelyard::inline v1::proof
