// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <limits>
#include <string>
#include <string_view>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>

namespace steelyard::inline v1::detail {

/// `value` where it is finite and above zero (subnormal numbers do not count).
/// @throws bad_argument otherwise: "normal_noise: a standard deviation of 0 ..."
inline double positive(std::string_view who, std::string_view what, double value) {
  if (is_finite(value) && value >= std::numeric_limits<double>::min()) return value;
  throw bad_argument(std::string(who) + ": " + std::string(what) + " of " + plain_number(value) +
                     " is not allowed; it must be a finite number above 0");
}

/// `value` where it is finite and zero or more.
/// @throws bad_argument otherwise
inline double not_negative(std::string_view who, std::string_view what, double value) {
  if (is_finite(value) && value >= 0.0) return value;
  throw bad_argument(std::string(who) + ": " + std::string(what) + " of " + plain_number(value) +
                     " is not allowed; it must be a finite number, 0 or more");
}

/// `value` where it lies between 0 and 1, ends included.
/// @throws bad_argument otherwise
inline double share(std::string_view who, std::string_view what, double value) {
  if (is_finite(value) && value >= 0.0 && value <= 1.0) return value;
  throw bad_argument(std::string(who) + ": " + std::string(what) + " of " + plain_number(value) +
                     " is not allowed; it must lie between 0 and 1");
}

[[noreturn]] inline void refuse_truth(std::string_view who, double truth, std::string_view allowed) {
  throw bad_readout(std::string(who) + ": a true value of " + plain_number(truth) +
                    " makes no sense here; it must be " + std::string(allowed));
}

/// A true value that is a finite number.
/// @throws bad_readout otherwise
inline double finite_truth(std::string_view who, double truth) {
  if (!is_finite(truth)) refuse_truth(who, truth, "a finite number");
  return truth;
}

/// A true value of zero or more; what a sum of rounded terms may leave below
/// zero (1e-12) counts as zero.
/// @throws bad_readout otherwise
inline double truth_from_zero(std::string_view who, double truth) {
  if (!is_finite(truth) || truth < -1e-12) refuse_truth(who, truth, "a finite number, 0 or more");
  return truth < 0.0 ? 0.0 : truth;
}

/// A true value that is a probability, to within 1e-12.
/// @throws bad_readout otherwise
inline double truth_as_share(std::string_view who, double truth) {
  if (!is_finite(truth) || truth < -1e-12 || truth > 1.0 + 1e-12)
    refuse_truth(who, truth, "a probability between 0 and 1");
  return truth < 0.0 ? 0.0 : truth > 1.0 ? 1.0 : truth;
}

}  // namespace steelyard::inline v1::detail
