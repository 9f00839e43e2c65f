// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <limits>
#include <string>
#include <string_view>
#include <utility>

#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/scalar_instrument.hpp>

namespace steelyard::inline v1 {

/// Made by `rounded` and `rounded_down`.
template <class Instrument>
class rounded_instrument
    : public scalar_instrument<rounded_instrument<Instrument>, typename Instrument::truth_type> {
  using truth_t = typename Instrument::truth_type;
  using base = scalar_instrument<rounded_instrument<Instrument>, truth_t>;

 public:
  static constexpr scale_of scale_kind = scale_of::steps;

  /// @param start where the cell shown as 0 begins: minus half a step, or 0
  rounded_instrument(double step, double start, Instrument inner)
      : inner_(std::move(inner)), step_(detail::positive("rounded", "a display step", step)), start_(start) {}

  [[nodiscard]] std::string_view name() const noexcept { return "rounded"; }
  [[nodiscard]] double lowest_reading() const {
    double const low = inner_.lowest_reading();
    return low > std::numeric_limits<double>::lowest() ? step_ * (step_of(low) - 0.25) : low;
  }
  [[nodiscard]] double highest_reading() const {
    double const high = inner_.highest_reading();
    return high < 1e300 ? step_ * (step_of(high) + 0.25) : std::numeric_limits<double>::max();
  }
  [[nodiscard]] std::string shows() const {
    return "multiples of " + detail::plain_number(step_) + ", rounded from " + inner_.shows();
  }
  [[nodiscard]] double scale() const { return inner_.scale(); }
  [[nodiscard]] truth_t admit(truth_t const& truth) const { return inner_.admit(truth); }

  [[nodiscard]] bool can_show(shown const& reading) const {
    if (!base::can_show(reading)) return false;
    if (reading.what() == shown::kind::within) return first_from(reading.lower()) <= last_to(reading.upper());
    if (reading.what() != shown::kind::number) return true;
    double const steps = reading.lower() / step_, off = steps - std::floor(steps + 0.5);
    return std::abs(off) <= slack + 1e-15 * std::abs(steps);
  }

  [[nodiscard]] double log_density(double x, truth_t const& truth) const {
    return log_raw(cell::around(x + (start_ + 0.5 * step_), 0.5 * step_), truth);
  }
  [[nodiscard]] double log_below(double x, truth_t const& truth) const {
    double const edge = step_ * first_from(x) + start_;
    return inner_.log_below(edge, truth);
  }
  [[nodiscard]] double log_above(double x, truth_t const& truth) const {
    double const edge = step_ * (last_to(x) + 1.0) + start_;
    if constexpr (Instrument::scale_kind == scale_of::whole) return inner_.log_above(first_count(edge) - 0.5, truth);
    return inner_.log_above(edge, truth);
  }
  [[nodiscard]] double log_within(cell const& c, truth_t const& truth) const {
    double const first = first_from(c.lower), last = last_to(c.upper);
    if (first > last) return detail::impossible;
    return log_raw(cell::between(step_ * first + start_, step_ * (last + 1.0) + start_), truth);
  }
  [[nodiscard]] double fake(truth_t const& truth, draws& d) const {
    return step_ * step_of(static_cast<double>(inner_.fake(truth, d)));
  }

 private:
  static constexpr double slack = 1e-6;  // in steps: what a decimal fraction loses in binary, and a printed digit

  [[nodiscard]] double step_of(double x) const { return std::floor((x - start_) / step_ + 1e-12); }
  [[nodiscard]] double first_from(double x) const { return std::ceil(x / step_ - slack); }
  [[nodiscard]] double last_to(double x) const { return std::floor(x / step_ + slack); }
  [[nodiscard]] double first_count(double edge) const { return std::ceil(edge - 1e-12 * step_); }

  /// What is rounded lies in `raw`, for whole numbers its upper end excluded.
  [[nodiscard]] double log_raw(cell const& raw, truth_t const& truth) const {
    if constexpr (Instrument::scale_kind == scale_of::whole) {
      double const first = first_count(raw.lower), last = first_count(raw.upper) - 1.0;
      if (first > last) return detail::impossible;
      return inner_.log_within(cell::between(first, last), truth);
    }
    return inner_.log_within(raw, truth);
  }

  Instrument inner_;
  double step_;
  double start_;
};

/// A display that rounds to the nearest multiple of `step`, halves upwards:
/// showing 2.3 in steps of 0.1 says "between 2.25 and 2.35", and the likelihood
/// is the probability of that interval, not a density at its middle.
/// A reading off the grid by more than a millionth of a step can never be shown.
/// @param instrument anything made here that shows one number and is not rounded already
/// @throws bad_argument unless step is finite and above 0
template <class Instrument>
auto rounded(double step, Instrument instrument) {
  static_assert(detail::scalar<Instrument>, "steelyard: rounded(step, instrument) needs an instrument that shows one "
                                            "number: derive yours from sy::scalar_instrument");
  if constexpr (detail::scalar<Instrument>) {
    static_assert(Instrument::scale_kind != scale_of::steps, "steelyard: this instrument is rounded already");
    return rounded_instrument<Instrument>(step, -0.5 * step, std::move(instrument));
  }
}

/// A display that drops what is beyond its last digit: showing 2.3 in steps of
/// 0.1 says "2.3 to 2.4" (a clock, a counter, an integer conversion of positive
/// numbers). Otherwise as `rounded`.
template <class Instrument>
auto rounded_down(double step, Instrument instrument) {
  static_assert(detail::scalar<Instrument>, "steelyard: rounded_down(step, instrument) needs an instrument that shows "
                                            "one number: derive yours from sy::scalar_instrument");
  if constexpr (detail::scalar<Instrument>) {
    static_assert(Instrument::scale_kind != scale_of::steps, "steelyard: this instrument is rounded already");
    return rounded_instrument<Instrument>(step, 0.0, std::move(instrument));
  }
}

}  // namespace steelyard::inline v1
