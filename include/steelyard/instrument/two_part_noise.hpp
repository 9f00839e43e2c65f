// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string_view>

#include <steelyard/instrument/normal_noise.hpp>

namespace steelyard::inline v1 {

/// The two parts of a data sheet's "0.5 units + 2 % of reading", as standard
/// deviations: `absolute` in units of the reading, `relative` as a share of |truth|.
struct noise_parts {
  double absolute = 0.0;
  double relative = 0.0;
};

/// Made by `two_part_noise` and `relative_noise`.
class two_part_instrument : public detail::gaussian<two_part_instrument> {
 public:
  explicit two_part_instrument(noise_parts parts) : parts_(parts) {
    detail::not_negative("two_part_noise", "an absolute part", parts.absolute);
    detail::not_negative("two_part_noise", "a relative part", parts.relative);
    if (!(parts.absolute > 0.0)) detail::positive(name(), "a share", parts.relative);
  }

  [[nodiscard]] std::string_view name() const noexcept {
    return parts_.absolute > 0.0 ? "two_part_noise" : "relative_noise";
  }
  [[nodiscard]] double scale() const noexcept { return parts_.absolute; }
  [[nodiscard]] double sd(double truth) const noexcept {
    return detail::root_sum_square(parts_.absolute, parts_.relative * (truth < 0.0 ? -truth : truth));
  }
  [[nodiscard]] double log_sd(double truth) const noexcept { return detail::portable_log(sd(truth)); }

 private:
  noise_parts parts_;
};

/// Normal noise of variance absolute^2 + (relative truth)^2.
/// @throws bad_argument where a part is negative or both are 0
inline two_part_instrument two_part_noise(noise_parts parts) { return two_part_instrument(parts); }

/// Normal noise with a standard deviation of `share` times |truth|.
///   At a truth of 0 it has no noise: any other reading is impossible there.
/// @throws bad_argument unless share is finite and above 0
inline two_part_instrument relative_noise(double share) {
  return two_part_instrument({.absolute = 0.0, .relative = detail::positive("relative_noise", "a share", share)});
}

}  // namespace steelyard::inline v1
