// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <memory>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/student.hpp>
#include <steelyard/estimate/weighted_column.hpp>

namespace steelyard::inline v1 {

/// A quantile, inf{x : F(x) >= p}, with Woodruff limits at any level.
///   ends: the quantiles at p -+ t s, s the standard error of F at the value; t has the degrees of freedom
///   that the carriers at that very end allow, so an end with too little beyond it is unbounded, not clipped
///                                                            [Woodruff, JASA 47, 1952, 635]
///   standard error: half the width of the 68.27 % limits. Where it does not tell how far the exact quantile may lie the
///   verdict is no better than `strained`: one of the 99.73 % limits lies over 12 standard errors away, as across a gap
///   between modes, or both together lie within 3, as where the 68.27 % limits took in the gap already.
/// Handed on as a plain `estimate` it answers value -+ t se in place of Woodruff limits.
class quantile_result : public estimate {
 public:
  quantile_result() = default;
  quantile_result(std::shared_ptr<detail::weighted_column const> column, double p) : column_(std::move(column)), p_(p) {
    std::size_t const at = column_->position(p_);
    value_of_f_ = column_->share_of_first(column_->up_to(at));
    if (!(value_of_f_.standard_error > 0.0)) value_of_f_ = column_->share_of_first(column_->before(at));
    static_cast<estimate&>(*this) = value_of_f_;
    value = column_->value(at);
    interval const usual = error_interval(one_sigma);
    double const up = usual.upper - value, down = value - usual.lower;
    standard_error = usual.lower_known && usual.upper_known ? 0.5 * (up + down)
                     : usual.upper_known                    ? up
                     : usual.lower_known                    ? down
                                                            : 0.0;
    if (!usual.lower_known && !usual.upper_known)
      lower_verdict(steelyard::verdict::broken);
    else if (!usual.lower_known || !usual.upper_known)
      lower_verdict(steelyard::verdict::strained);
    else if (verdict() == steelyard::verdict::sound && !tells_how_far())
      lower_verdict(steelyard::verdict::strained);
  }

  /// The order p of the quantile, and F at the value, with its error.
  [[nodiscard]] double order() const noexcept { return p_; }
  [[nodiscard]] estimate const& cumulative() const noexcept { return value_of_f_; }

  /// Where the exact quantile lies, given Monte Carlo error.
  /// @throws bad_argument for a level outside (0, 1).
  interval error_interval(double level) const {
    if (!detail::is_finite(level) || !(level > 0.0 && level < 1.0))
      throw bad_argument("error_interval: the level " + detail::plain_number(level) + " is outside (0, 1)");
    interval limits;
    double const beyond = 0.5 * (1.0 - level);
    limits.lower_known = end(beyond, false, limits.lower);
    limits.upper_known = end(beyond, true, limits.upper);
    return limits;
  }

  static constexpr double one_sigma = 0.682689492137085897, three_sigma = 0.997300203936739811;

 private:
  /// Whether limits reach about as far as the standard error says, where both are known.
  [[nodiscard]] bool tells_how_far() const {
    interval const far = error_interval(three_sigma);
    double const three = 3.0 * standard_error;
    double const up = far.upper_known ? far.upper - value : three, down = far.lower_known ? value - far.lower : three;
    return up <= 4.0 * three && down <= 4.0 * three && up + down >= three;
  }
  /// One end, by fixed point: fewer carriers beyond mean a larger t, and a further end.
  bool end(double beyond, bool upper, double& limit) const {
    double dof = degrees_of_freedom, reach = 0.0;
    for (int round = 0; round < 60; ++round) {
      if (!(dof > 0.0)) return false;
      double const next = detail::student_upper_quantile(beyond, dof) * value_of_f_.standard_error;
      if (next <= reach) return true;
      reach = next;
      double const target = upper ? p_ + reach : p_ - reach;
      if (!(target > 0.0 && target < 1.0)) return false;
      std::size_t const at = column_->position(target);
      limit = column_->value(at);
      dof = column_->share_of_first(upper ? column_->before(at) : column_->up_to(at)).degrees_of_freedom;
    }
    return true;
  }

  std::shared_ptr<detail::weighted_column const> column_;
  double p_ = 0.0;
  estimate value_of_f_;
};

}  // namespace steelyard::inline v1
