// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/instrument/correlated_noise.hpp>
#include <steelyard/instrument/normal_noise.hpp>

namespace steelyard::inline v1 {

/// Made by `with_offset` from an instrument with normal noise.
template <class Instrument>
class offset_instrument : public detail::gaussian<offset_instrument<Instrument>> {
  using base = detail::gaussian<offset_instrument<Instrument>>;

 public:
  offset_instrument(Instrument inner, double offset_sd)
      : inner_(std::move(inner)), offset_sd_(detail::positive("with_offset", "a standard deviation", offset_sd)) {}

  using base::draw;
  using base::score;

  [[nodiscard]] std::string_view name() const noexcept { return "with_offset"; }
  [[nodiscard]] double scale() const { return inner_.scale(); }
  [[nodiscard]] double admit(double truth) const { return inner_.admit(truth); }
  [[nodiscard]] double sd(double truth) const { return detail::root_sum_square(offset_sd_, inner_.sd(truth)); }
  [[nodiscard]] double log_sd(double truth) const { return detail::portable_log(sd(truth)); }

  using base::check;
  template <std::size_t N>
  void check(std::array<double, N> const& reading) const {
    for (double const each : reading) base::check(each);
  }

  /// Several readings of one instrument that share its one unknown offset o:
  /// the integral over o of the product of their densities, in closed form.
  ///   r_i = reading_i - truth_i, h_i = (offset_sd / s_i)^2, H = 1 + sum h_i, m = sum h_i r_i / H:
  ///   log = -(sum ((r_i - m) / s_i)^2 + (m / offset_sd)^2) / 2 - log(H)/2 - sum (log s_i + log(2 pi)/2)
  template <std::size_t N>
  log_likelihood score(std::array<double, N> const& reading, std::array<double, N> const& truth) const {
    check(reading);
    std::array<double, N> sd{}, away{};
    double whole = 1.0, pull = 0.0, sum = 0.0;
    for (std::size_t i = 0; i < N; ++i) {
      double const true_value = admit(truth[i]), s = inner_.sd(true_value);
      if (!(s > 0.0))
        detail::refuse_truth(name(), true_value, "one at which the instrument has noise, to share an offset");
      double const weight = 2.0 * detail::half_square(detail::deviate(offset_sd_, 0.0, s));
      sd[i] = s;
      away[i] = reading[i] - true_value;
      whole += weight;
      pull += weight * away[i];
      sum -= inner_.log_sd(true_value) + detail::half_log_two_pi;
    }
    double const offset = pull / whole;
    sum -= 0.5 * detail::portable_log(whole) + detail::half_square(detail::deviate(offset, 0.0, offset_sd_));
    for (std::size_t i = 0; i < N; ++i) sum -= detail::half_square(detail::deviate(away[i], offset, sd[i]));
    return log_likelihood{sum};
  }

  template <std::size_t N>
  std::array<double, N> draw(std::array<double, N> const& truth, draws& d) const {
    std::array<double, N> fake{};
    double const offset = d.normal(0.0, offset_sd_);
    for (std::size_t i = 0; i < N; ++i) fake[i] = offset + inner_.draw(truth[i], d);
    return fake;
  }

 private:
  Instrument inner_;
  double offset_sd_;
};

/// A true value together with the offset of the instrument that reads it, both
/// parts of the state.
struct displaced {
  double truth;
  double offset;
};

/// Made by `with_offset` from any other instrument on a continuous scale.
template <class Instrument>
class drawn_offset_instrument : public scalar_instrument<drawn_offset_instrument<Instrument>, displaced> {
 public:
  drawn_offset_instrument(Instrument inner, double offset_sd)
      : inner_(std::move(inner)), offset_sd_(detail::positive("with_offset", "a standard deviation", offset_sd)) {}

  /// For the user's sampler: the offset of this instrument in this state.
  double draw_offset(draws& d) const { return d.normal(0.0, offset_sd_); }

  [[nodiscard]] std::string_view name() const noexcept { return "with_offset"; }
  [[nodiscard]] double scale() const { return inner_.scale(); }
  [[nodiscard]] displaced admit(displaced const& state) const {
    return {inner_.admit(state.truth), detail::finite_truth(name(), state.offset)};
  }

  [[nodiscard]] double log_density(double x, displaced const& state) const {
    return inner_.log_density(x - state.offset, state.truth);
  }
  [[nodiscard]] double log_below(double x, displaced const& state) const {
    return inner_.log_below(x - state.offset, state.truth);
  }
  [[nodiscard]] double log_above(double x, displaced const& state) const {
    return inner_.log_above(x - state.offset, state.truth);
  }
  [[nodiscard]] double log_within(cell const& c, displaced const& state) const {
    return inner_.log_within(c.from(state.offset), state.truth);
  }
  [[nodiscard]] double fake(displaced const& state, draws& d) const {
    return inner_.fake(state.truth, d) + state.offset;
  }

 private:
  Instrument inner_;
  double offset_sd_;
};

/// An instrument whose zero is off by an unknown amount, normal about 0 with
/// standard deviation `offset_sd`: reading = what `instrument` would read + offset.
/// - Normal noise of any kind: the offset is integrated out in closed form. One
///   reading simply has more noise; an array of readings, with an array of
///   truths, shares one offset, and so tells more about differences than about levels.
/// - Correlated noise: offset_sd^2 is added to every covariance.
/// - Any other noise: the offset is drawn. It is one more unknown of the state:
///   the sampler draws it with `draw_offset`, the state keeps it, and the readout
///   returns `sy::displaced{truth, offset}`. Readings that share the state's
///   offset share the instrument's; the score stays exact and the offset gets a
///   posterior like everything else.
/// Rounding comes last: rounded(step, with_offset(...)).
/// @throws bad_argument unless offset_sd is finite and above 0
template <class Instrument>
auto with_offset(Instrument instrument, double offset_sd) {
  if constexpr (std::is_base_of_v<detail::gaussian<Instrument>, Instrument>) {
    return offset_instrument<Instrument>(std::move(instrument), offset_sd);
  } else {
    static_assert(detail::scalar<Instrument>, "steelyard: with_offset(instrument, sd) needs an instrument that shows "
                                              "one number: derive yours from sy::scalar_instrument");
    if constexpr (detail::scalar<Instrument>) {
      static_assert(Instrument::scale_kind == scale_of::continuous,
                    "steelyard: with_offset(instrument, sd) needs an instrument on a continuous scale; round last: "
                    "rounded(step, with_offset(...))");
      return drawn_offset_instrument<Instrument>(std::move(instrument), offset_sd);
    }
  }
}

template <std::size_t N>
correlated_instrument<N> with_offset(correlated_instrument<N> const& instrument, double offset_sd) {
  detail::positive("with_offset", "a standard deviation", offset_sd);
  auto covariance = instrument.covariance();
  for (auto& row : covariance)
    for (double& each : row) each += offset_sd * offset_sd;
  return correlated_instrument<N>(covariance);
}

}  // namespace steelyard::inline v1
