// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <limits>

namespace steelyard::inline v1 {

/// A range whose ends may be unknown. No infinities: an unknown end holds the
/// largest finite number of its sign, and its flag says so.
struct interval {
  double lower = std::numeric_limits<double>::lowest();
  double upper = std::numeric_limits<double>::max();
  bool lower_known = false;
  bool upper_known = false;
};

}  // namespace steelyard::inline v1
