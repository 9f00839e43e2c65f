// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <concepts>
#include <string_view>

#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/instrument/checks.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

/// Whether a detection curve is logistic in the size or in its logarithm.
enum class size_scale { linear, logarithmic };

/// How the chance of a hit grows with the size of a flaw.
struct detection_curve {
  double half = 1.0;                           ///< size found half of the time (false calls apart)
  double slope = 1.0;                          ///< of the log-odds there, per unit of size or of log(size)
  size_scale scale = size_scale::logarithmic;  ///< common practice for crack sizes
  double false_calls = 0.0;                    ///< chance of a hit where nothing is
};

/// Made by `hit_miss`.
class hit_miss_instrument {
 public:
  using truth_type = double;

  explicit hit_miss_instrument(detection_curve curve)
      : curve_(curve),
        log_half_(detail::portable_log(detail::positive(name(), "a size found half of the time", curve.half))),
        log_false_(detail::portable_log(detail::share(name(), "a chance of false calls", curve.false_calls))),
        log_true_(detail::portable_log1p(-curve.false_calls)) {
    detail::positive(name(), "a slope", curve.slope);
  }

  [[nodiscard]] std::string_view name() const noexcept { return "hit_miss"; }

  void check(bool) const noexcept {}

  /// log P(hit) or log P(miss) for a flaw of this size, no digits lost in either tail.
  /// @throws bad_readout for a size that is negative or not finite
  log_likelihood score(bool hit, double size) const {
    double const x = log_odds(detail::truth_from_zero(name(), size));
    double const log_share = log_true_ - softplus(hit ? -x : x);
    return log_likelihood{hit && curve_.false_calls > 0.0 ? detail::log_sum(log_false_, log_share)
                                                          : detail::log_product(log_share, 0.0)};
  }
  template <class Other>
    requires(!std::same_as<Other, bool>)
  log_likelihood score(Other, double) const = delete;  // a reading is a hit (true) or a miss (false)

  bool draw(double size, draws& d) const { return d.uniform() < detail::portable_exp(score(true, size).value); }

 private:
  [[nodiscard]] double log_odds(double size) const {
    if (curve_.scale == size_scale::linear) return std::min(curve_.slope * (size - curve_.half), 1e300);
    if (!(size > 0.0)) return -1e300;
    return std::clamp(curve_.slope * (detail::portable_log(size) - log_half_), -1e300, 1e300);
  }
  /// log(1 + e^x)
  static double softplus(double x) {
    return x > 0.0 ? x + detail::portable_log1p(detail::portable_exp(-x))
                   : detail::portable_log1p(detail::portable_exp(x));
  }

  detection_curve curve_;
  double log_half_;
  double log_false_;
  double log_true_;
};

/// An inspection that finds a flaw or not; reading: `true` for a hit; truth: the
/// size of the flaw, 0 or more.
///   P(hit) = f + (1 - f) / (1 + e^-x),  x = slope (size - half) or slope log(size / half), f = false calls
///   [hit/miss detection curves: Berens, Metals Handbook 17, 1989; MIL-HDBK-1823A; from memory]
/// @throws bad_argument unless half and slope are above 0 and false calls a probability
inline hit_miss_instrument hit_miss(detection_curve curve) { return hit_miss_instrument(curve); }

}  // namespace steelyard::inline v1
