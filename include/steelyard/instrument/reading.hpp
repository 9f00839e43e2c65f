// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/base/error.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/instrument/instrument_for.hpp>
#include <steelyard/instrument/shown.hpp>
#include <steelyard/weigh/callable.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

namespace detail {

template <class Instrument, class Found>
struct truth_for {
  using type = Found;
};
template <class Instrument, class Found>
  requires(std::is_arithmetic_v<typename Instrument::truth_type> &&
           (std::is_arithmetic_v<Found> || std::is_enum_v<Found>))
struct truth_for<Instrument, Found> {
  using type = typename Instrument::truth_type;
};

/// The largest number in a reading, in size; 0 where it is not made of numbers.
template <class Value>
double size_of_reading(Value const& value) {
  if constexpr (std::is_same_v<Value, bool> || std::is_enum_v<Value>) {
    return 0.0;
  } else if constexpr (std::is_convertible_v<Value const&, shown>) {
    shown const reading = value;
    double const lower = reading.lower() < 0.0 ? -reading.lower() : reading.lower();
    double const upper = reading.upper() < 0.0 ? -reading.upper() : reading.upper();
    return lower > upper ? lower : upper;
  } else if constexpr (requires { value.begin(); value.end(); }) {
    double largest = 0.0;
    for (auto const& each : value) {
      double const size = size_of_reading(each);
      if (size > largest) largest = size;
    }
    return largest;
  } else {
    return 0.0;
  }
}

}  // namespace detail

/// What was read, where in the state it was read, and how the instrument errs:
/// a weighter, called with a state.
///   sy::reading("gauge", 2.31, &tank::level, sy::normal_noise(0.05))
/// Without a name it bears that of its readout, where that has one.
/// @param value   a number, `under`, `over`, `within`, or what else the instrument shows
/// @param where   readout of the true value from a state
/// @throws bad_argument where the instrument could never show the value.
///         When called: bad_readout where the true value makes no sense for it.
template <class Value, class Readout, class Instrument>
class reading {
  struct nothing {};
  template <class State, class Found = detail::result_t<Readout, State const&>>
  using truth_in = typename detail::truth_for<Instrument, std::conditional_t<std::is_void_v<Found>, nothing, Found>>::type;

 public:
  reading(std::string name, Value value, Readout where, Instrument instrument)
      : name_(std::move(name)), value_(std::move(value)), where_(std::move(where)), instrument_(std::move(instrument)) {
    if (name_.empty()) name_ = name_of(where_);
    if constexpr (requires { typename Instrument::truth_type; }) {
      using truth = typename Instrument::truth_type;
      static_assert(instrument_for<Instrument, Value, truth> || instrument_for<Instrument, Value, Value>,
                    "steelyard: reading(name, value, readout, instrument): this instrument shows no values of this "
                    "type");
    }
    if constexpr (requires { instrument_.check(value_); }) {
      try {
        instrument_.check(value_);
      } catch (bad_argument const& problem) {
        throw bad_argument(prefix() + problem.what());
      }
    }
  }
  reading(Value value, Readout where, Instrument instrument)
      : reading(std::string(), std::move(value), std::move(where), std::move(instrument)) {}

  [[nodiscard]] std::string_view name() const noexcept { return name_; }
  [[nodiscard]] Value const& value() const noexcept { return value_; }
  [[nodiscard]] Readout const& readout() const noexcept { return where_; }
  [[nodiscard]] Instrument const& instrument() const noexcept { return instrument_; }

  /// Whether the instrument scores the value against what the readout finds in such a state.
  template <class State>
  static constexpr bool scores_state = requires(Instrument const& i, Value const& v, truth_in<State> const& t) {
    { i.score(v, t) } -> std::same_as<log_likelihood>;
  };

  /// Log-likelihood of the reading in this state.
  template <class State>
    requires std::is_invocable_v<Readout const&, State const&> && scores_state<State>
  log_likelihood operator()(State const& state) const {
    try {
      return instrument_.score(value_, static_cast<truth_in<State>>(detail::call(where_, state)));
    } catch (bad_readout const& problem) {
      throw bad_readout(prefix() + problem.what());
    }
  }

  [[nodiscard]] auto worker_instance() const
    requires detail::per_worker_callable<Readout>
  {
    return steelyard::reading(name_, value_, where_.worker_instance(), instrument_);
  }

  /// A sentence where the reading is possible but so far off the instrument's
  /// own scale that a wrong unit is likely: 12 orders of magnitude above its
  /// typical error. Empty where there is nothing to say.
  [[nodiscard]] std::string doubts() const {
    if constexpr (requires { { instrument_.scale() } -> std::convertible_to<double>; }) {
      double const scale = instrument_.scale(), size = detail::size_of_reading(value_);
      if (scale > 0.0 && size >= 1e12 * scale)
        return prefix() + "a value of " + detail::short_number(size) +
               " is 12 orders of magnitude or more above the instrument's error of " + detail::short_number(scale) +
               "; check its unit";
    }
    return {};
  }
  /// The same, or a sentence where reading and true value of this state are 12
  /// orders of magnitude apart.
  template <class State>
    requires std::is_invocable_v<Readout const&, State const&>
  [[nodiscard]] std::string doubts(State const& state) const {
    std::string sentence = doubts();
    if (!sentence.empty()) return sentence;
    using found = std::remove_cvref_t<std::invoke_result_t<Readout const&, State const&>>;
    if constexpr (std::is_arithmetic_v<found> && !std::is_same_v<found, bool>) {
      double const size = detail::size_of_reading(value_);
      double const truth = detail::size_of_reading(static_cast<double>(detail::call(where_, state)));
      if (size > 0.0 && truth > 0.0 && (size >= 1e12 * truth || truth >= 1e12 * size))
        return prefix() + "a value of " + detail::short_number(size) + " and a true value of " +
               detail::short_number(truth) + " are 12 orders of magnitude or more apart; check the unit";
    }
    return {};
  }

 private:
  static std::string name_of(Readout const& where) {
    if constexpr (requires { std::string(std::string_view(where.name())); })
      return std::string(std::string_view(where.name()));
    else
      return "reading";
  }
  [[nodiscard]] std::string prefix() const {
    return name_ == "reading" ? std::string("reading: ") : "reading '" + name_ + "': ";
  }

  std::string name_;
  Value value_;
  Readout where_;
  Instrument instrument_;
};

}  // namespace steelyard::inline v1
