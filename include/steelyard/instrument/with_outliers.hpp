// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `with_outliers`.
template <class Usual, class Wide>
class outlier_instrument
    : public scalar_instrument<outlier_instrument<Usual, Wide>, typename Usual::truth_type> {
  using truth_t = typename Usual::truth_type;

 public:
  static constexpr scale_of scale_kind = Usual::scale_kind;

  outlier_instrument(Usual usual, double share, Wide wide)
      : usual_(std::move(usual)),
        wide_(std::move(wide)),
        share_(detail::share("with_outliers", "a share", share)),
        log_share_(detail::portable_log(share)),
        log_rest_(detail::portable_log1p(-share)) {}

  [[nodiscard]] std::string_view name() const noexcept { return "with_outliers"; }
  [[nodiscard]] double lowest_reading() const { return std::min(usual_.lowest_reading(), wide_.lowest_reading()); }
  [[nodiscard]] double highest_reading() const { return std::max(usual_.highest_reading(), wide_.highest_reading()); }
  [[nodiscard]] std::string shows() const { return usual_.shows() + ", as outliers " + wide_.shows(); }
  [[nodiscard]] double scale() const { return usual_.scale(); }
  [[nodiscard]] truth_t admit(truth_t const& truth) const { return wide_.admit(usual_.admit(truth)); }

  [[nodiscard]] bool can_show(shown const& reading) const {
    return usual_.can_show(reading) || wide_.can_show(reading);
  }

  [[nodiscard]] double log_density(double x, truth_t const& truth) const {
    return mixed(usual_.log_density(x, truth), wide_.log_density(x, truth));
  }
  [[nodiscard]] double log_below(double x, truth_t const& truth) const {
    return mixed(usual_.log_below(x, truth), wide_.log_below(x, truth));
  }
  [[nodiscard]] double log_above(double x, truth_t const& truth) const {
    return mixed(usual_.log_above(x, truth), wide_.log_above(x, truth));
  }
  [[nodiscard]] double log_within(cell const& c, truth_t const& truth) const {
    return mixed(usual_.log_within(c, truth), wide_.log_within(c, truth));
  }
  [[nodiscard]] auto fake(truth_t const& truth, draws& d) const {
    return d.chance(share_) ? wide_.fake(truth, d) : usual_.fake(truth, d);
  }

 private:
  [[nodiscard]] double mixed(double usual, double wide) const {
    return detail::log_sum(detail::log_product(log_rest_, usual), detail::log_product(log_share_, wide));
  }

  Usual usual_;
  Wide wide_;
  double share_;
  double log_share_;
  double log_rest_;
};

/// A share of gross outliers: each reading comes from `instrument` with
/// probability 1 - share and from `wide` otherwise, and nobody knows which.
///   likelihood = (1 - share) usual + share wide
///   sy::with_outliers(sy::normal_noise(0.05), 0.01, sy::anywhere(0.0, 10.0))
/// Both show numbers of one kind: continuous, whole, or steps (then of one
/// size; better round last: rounded(step, with_outliers(...))).
/// @throws bad_argument unless share lies between 0 and 1
template <class Usual, class Wide>
auto with_outliers(Usual instrument, double share, Wide wide) {
  static_assert(detail::scalar<Usual> && detail::scalar<Wide>,
                "steelyard: with_outliers(instrument, share, wide) needs instruments that show one number: derive "
                "yours from sy::scalar_instrument");
  if constexpr (detail::scalar<Usual> && detail::scalar<Wide>) {
    static_assert(Usual::scale_kind == Wide::scale_kind,
                  "steelyard: with_outliers(instrument, share, wide): one shows continuous numbers and the other whole "
                  "ones or steps; their likelihoods cannot be mixed");
    static_assert(std::is_same_v<typename Usual::truth_type, typename Wide::truth_type>,
                  "steelyard: with_outliers(instrument, share, wide): the two take different true values; put a drawn "
                  "offset outside: with_offset(with_outliers(...), sd)");
    return outlier_instrument<Usual, Wide>(std::move(instrument), share, std::move(wide));
  }
}

}  // namespace steelyard::inline v1
