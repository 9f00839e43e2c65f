// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <limits>
#include <string>

#include <steelyard/base/error.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/instrument/cell.hpp>
#include <steelyard/instrument/checks.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/shown.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

/// What kind of numbers an instrument shows.
enum class scale_of { continuous, whole, steps };

/// Base of every instrument that shows one number for one true value: checks
/// readings and truths, scores numbers and `under`, `over`, `within`, and
/// fakes. An instrument `Self` of your own derives from `scalar_instrument<Self>`
/// (`<Self, Truth>` where the true value is more than a number) and then works
/// in every modifier; it provides, all for a true value that `admit` has let
/// through, with natural logarithms and `lowest()` for the logarithm of 0:
///   name()                        std::string_view, for sentences
///   log_density(x, truth)         density, or probability on whole numbers and steps
///   log_below(x, truth)           log P(shows less than x)
///   log_above(x, truth)           log P(shows more than x)
///   log_within(cell, truth)       log P(shows a number in the cell, ends included), without cancelling
///   fake(truth, draws)            one reading
/// and, where the defaults here do not fit, the members below.
template <class Self, class Truth = double>
class scalar_instrument {
 public:
  using truth_type = Truth;
  static constexpr scale_of scale_kind = scale_of::continuous;

  /// Log-likelihood of `reading` where `truth` is true, all constants in: a
  /// log-density, or a log-probability where the instrument shows whole numbers
  /// or steps or the reading is `under`, `over` or `within`.
  /// @throws bad_argument for a reading that can never be shown,
  ///         bad_readout for a truth that makes no sense.
  log_likelihood score(shown const& reading, Truth const& truth) const {
    check(reading);
    return log_likelihood{log_score(reading, self().admit(truth))};
  }

  /// One reading as the instrument would show it.
  /// @throws bad_readout for a truth that makes no sense.
  auto draw(Truth const& truth, draws& d) const { return self().fake(self().admit(truth), d); }

  /// @throws bad_argument for a reading that can never be shown, whatever the truth.
  void check(shown const& reading) const {
    if (self().can_show(reading)) return;
    throw bad_argument(std::string(self().name()) + ": a reading of " + reading.text() +
                       " can never be shown; it shows " + self().shows());
  }

  /// Whether it can show this for some truth; by default what lies between the next two.
  [[nodiscard]] bool can_show(shown const& reading) const {
    double const low = self().lowest_reading(), high = self().highest_reading();
    switch (reading.what()) {
      case shown::kind::under: return reading.upper() > low;
      case shown::kind::over: return reading.lower() < high;
      case shown::kind::within:
      case shown::kind::number: break;
    }
    return reading.upper() >= low && reading.lower() <= high;
  }

  /// The smallest and the largest number it can show, whatever the truth.
  [[nodiscard]] double lowest_reading() const { return std::numeric_limits<double>::lowest(); }
  [[nodiscard]] double highest_reading() const { return std::numeric_limits<double>::max(); }
  /// What it shows, to end a sentence.
  [[nodiscard]] std::string shows() const { return "any finite number"; }
  /// The size of its typical error, 0 where that depends on the truth alone.
  [[nodiscard]] double scale() const { return 0.0; }
  /// The truth to score with. @throws bad_readout where it makes no sense.
  [[nodiscard]] Truth admit(Truth const& truth) const { return detail::finite_truth(self().name(), truth); }

 protected:
  scalar_instrument() = default;

 private:
  [[nodiscard]] Self const& self() const { return static_cast<Self const&>(*this); }

  [[nodiscard]] double log_score(shown const& reading, Truth const& truth) const {
    switch (reading.what()) {
      case shown::kind::under: return self().log_below(reading.upper(), truth);
      case shown::kind::over: return self().log_above(reading.lower(), truth);
      case shown::kind::within: return self().log_within(cell::between(reading.lower(), reading.upper()), truth);
      case shown::kind::number: break;
    }
    return self().log_density(reading.lower(), truth);
  }
};

namespace detail {

template <class I>
inline constexpr bool scalar = requires { typename I::truth_type; };
template <class I>
  requires requires { typename I::truth_type; }
inline constexpr bool scalar<I> = std::derived_from<I, scalar_instrument<I, typename I::truth_type>>;

}  // namespace detail

}  // namespace steelyard::inline v1
