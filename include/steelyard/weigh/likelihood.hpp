// SPDX-License-Identifier: BSL-1.0
#pragma once

namespace steelyard::inline v1 {

/// How well a state explains a reading, as a natural logarithm. Minus infinity
/// means impossible; plus infinity and NaN are refused by the run.
///   A constant left out cancels in every answer but the log-evidence: scores
///   without their constants may not be compared between models.
struct log_likelihood {
  double value;

  constexpr explicit log_likelihood(double log_value) noexcept : value(log_value) {}

  /// Two independent readings of one state: logarithms add.
  friend constexpr log_likelihood operator+(log_likelihood a, log_likelihood b) noexcept {
    return log_likelihood{a.value + b.value};
  }
};

/// How well a state explains a reading, on the plain scale: zero means
/// impossible; negative, infinite and NaN are refused by the run.
struct likelihood {
  double value;

  constexpr explicit likelihood(double plain_value) noexcept : value(plain_value) {}

  /// Two independent readings of one state: likelihoods multiply.
  friend constexpr likelihood operator*(likelihood a, likelihood b) noexcept {
    return likelihood{a.value * b.value};
  }
};

}  // namespace steelyard::inline v1
