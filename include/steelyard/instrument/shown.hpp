// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string>
#include <type_traits>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>

namespace steelyard::inline v1 {

/// "Below the limit": all that is known is that the instrument would have shown less.
struct under {
  double limit;
  constexpr explicit under(double below) noexcept : limit(below) {}
};

/// "Off the top": all that is known is that the instrument would have shown more.
struct over {
  double limit;
  constexpr explicit over(double above) noexcept : limit(above) {}
};

/// "Between the marks": the instrument would have shown a number from `lower`
/// to `upper`, ends included.
struct within {
  double lower;
  double upper;
  constexpr within(double from, double to) noexcept : lower(from), upper(to) {}
};

/// What an instrument showed: a number, or only that it lies under, over or
/// within limits. Made from any of the four, so a column of data may mix them:
///   std::vector<sy::shown> lives{10, 7, sy::over(32), 23};
/// On instruments that show whole numbers or steps the limits of `under` and
/// `over` are themselves excluded, so that under, equal and over make up 1.
/// @throws bad_argument where a limit is not a finite number, or `within` is empty.
class shown {
 public:
  enum class kind { number, under, over, within };

  template <class Number>
    requires(std::is_arithmetic_v<Number> && !std::is_same_v<Number, bool>)
  shown(Number number)  // NOLINT: implicit on purpose
      : shown(kind::number, static_cast<double>(number), static_cast<double>(number)) {}
  shown(steelyard::under reading) : shown(kind::under, reading.limit, reading.limit) {}   // NOLINT
  shown(steelyard::over reading) : shown(kind::over, reading.limit, reading.limit) {}     // NOLINT
  shown(steelyard::within reading) : shown(kind::within, reading.lower, reading.upper) {  // NOLINT
    if (!(lower_ < upper_))
      throw bad_argument("within: the lower end " + detail::plain_number(lower_) + " is not below the upper end " +
                         detail::plain_number(upper_));
  }

  [[nodiscard]] kind what() const noexcept { return kind_; }
  /// The number, the limit, or the lower end.
  [[nodiscard]] double lower() const noexcept { return lower_; }
  /// The number, the limit, or the upper end.
  [[nodiscard]] double upper() const noexcept { return upper_; }

  /// "2.31", "under 0.5", "over 32", "within 1 to 2".
  [[nodiscard]] std::string text() const {
    std::string const first = detail::plain_number(lower_);
    switch (kind_) {
      case kind::under: return "under " + first;
      case kind::over: return "over " + first;
      case kind::within: return "within " + first + " to " + detail::plain_number(upper_);
      case kind::number: break;
    }
    return first;
  }

 private:
  shown(kind what, double lower, double upper) : kind_(what), lower_(lower), upper_(upper) {
    if (!detail::is_finite(lower) || !detail::is_finite(upper))
      throw bad_argument("a reading of " + text() + " is not allowed; it must be made of finite numbers");
  }

  kind kind_;
  double lower_;
  double upper_;
};

}  // namespace steelyard::inline v1
