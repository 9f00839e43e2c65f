// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/base/bits.hpp>

namespace steelyard::inline v1 {

/// The numbers from `lower` to `upper`, with their middle and half the distance
/// between them: narrow cells are weighed by the latter two, wide ones by their
/// ends. What it was made from stays exact when it is moved, which is how a
/// narrow cell far out keeps its digits.
struct cell {
  double lower;
  double upper;
  double centre;
  double half;
  bool by_centre;  ///< made from centre and half, else from the ends

  static cell between(double from, double to) noexcept {
    double const first = detail::fence(from), last = detail::fence(to);  // the numbers, not what they were made of
    double const half_width = detail::minus(0.5 * last, 0.5 * first);
    return {first, last, detail::plus(first, half_width), half_width, false};
  }
  static cell around(double middle, double half_width) noexcept {
    return {detail::minus(middle, half_width), detail::plus(middle, half_width), middle, half_width, true};
  }
  /// The same cell as seen from `origin`.
  [[nodiscard]] cell from(double origin) const noexcept {
    if (by_centre) return around(detail::minus(centre, origin), half);
    double const start = detail::minus(lower, origin);
    return {start, detail::minus(upper, origin), detail::plus(start, half), half, false};
  }
};

}  // namespace steelyard::inline v1
