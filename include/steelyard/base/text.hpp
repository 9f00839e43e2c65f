// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <charconv>
#include <cmath>
#include <string>

#include <steelyard/base/bits.hpp>

namespace steelyard::inline v1::detail {

inline std::string number_with(double value, std::chars_format format, int digits) {
  char text[400];
  auto const end = std::to_chars(text, text + sizeof text, value, format, digits);
  return {text, end.ptr};
}

/// The shortest text that reads back as the same number.
inline std::string plain_number(double value) {
  if (is_nan(value)) return "NaN";
  char text[64];
  auto const end = std::to_chars(text, text + sizeof text, value);
  return {text, end.ptr};
}

/// Two or three digits, for a size or a limit in a sentence.
inline std::string short_number(double value) {
  if (!is_finite(value)) return plain_number(value);
  double const size = value < 0.0 ? -value : value;
  if (size >= 100.0 && size < 1e6) return number_with(value, std::chars_format::fixed, 0);
  return number_with(value, std::chars_format::general, size >= 1.0 ? 3 : 2);
}

/// "0.30786 +- 0.00044": both rounded to two digits of the standard error.
inline std::string rounded_to_error(double value, double error) {
  if (!is_finite(value) || !is_finite(error) || !(error > 0.0)) return plain_number(value) + " +- " + plain_number(error);
  if (value == 0.0) return "0 +- " + number_with(error, std::chars_format::general, 2);
  std::string const digits = number_with(error, std::chars_format::scientific, 1);
  int exponent = 0;
  std::from_chars(digits.data() + digits.find('e') + (digits[digits.find('e') + 1] == '+' ? 2 : 1),
                  digits.data() + digits.size(), exponent);
  int const places = 1 - exponent;
  double const size = value < 0.0 ? -value : value;
  if (places > 8 || size >= 1e9 || places < -3) {
    int top = 0;
    std::string const lead = number_with(value, std::chars_format::scientific, 1);
    std::from_chars(lead.data() + lead.find('e') + (lead[lead.find('e') + 1] == '+' ? 2 : 1), lead.data() + lead.size(), top);
    int const kept = top - exponent + 1;
    if (kept > 15) return plain_number(value) + " +- " + digits;
    return number_with(value, std::chars_format::scientific, kept < 0 ? 0 : kept) + " +- " + digits;
  }
  return number_with(value, std::chars_format::fixed, places < 0 ? 0 : places) + " +- " +
         number_with(error, std::chars_format::fixed, places < 0 ? 0 : places);
}

}  // namespace steelyard::inline v1::detail
