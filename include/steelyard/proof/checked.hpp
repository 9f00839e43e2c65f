// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>

namespace steelyard::inline v1::proof::detail {

namespace up = steelyard::v1::detail;

/// @throws bad_argument unless x is a finite number.
inline double finite(char const* where, char const* what, double x) {
  if (!up::is_finite(x))
    throw bad_argument(std::string(where) + ": " + what + ", " + up::plain_number(x) + ", must be a finite number");
  return x;
}
/// @throws bad_argument unless x is a positive finite number.
inline double positive(char const* where, char const* what, double x) {
  if (!up::is_finite(x) || !(x > 0.0))
    throw bad_argument(std::string(where) + ": " + what + ", " + up::plain_number(x) +
                       ", must be a positive finite number");
  return x;
}

}  // namespace steelyard::inline v1::proof::detail
