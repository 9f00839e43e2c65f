// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/count.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/instrument/reading.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

struct prediction_options {
  count seed = 1;
};

namespace detail {

/// The truth an instrument takes, from what a readout finds.
template <class Instrument, class Found>
decltype(auto) truth_of(Found const& found) {
  if constexpr (requires { typename Instrument::truth_type; })
    return static_cast<typename truth_for<Instrument, Found>::type>(found);
  else
    return found;
}

/// One faked reading for each state of positive weight, each from the state's own stream.
template <class X, class Readout, class Instrument>
auto fakes(weighted_sample<X> const& sample, Readout const& where, Instrument const& instrument, std::uint64_t seed) {
  using found = result_t<Readout, X const&>;
  using fake = std::remove_cvref_t<decltype(instrument.draw(truth_of<Instrument>(std::declval<found const&>()), std::declval<draws&>()))>;
  std::vector<std::optional<fake>> all(sample.size());
  for_each_state(
      *sample.store(), *sample.origin(), sample.size(), where,
      [&](std::size_t i) { return sample.log_weights()[i] > impossible; },
      [&](auto const& own, std::size_t i, X const& state) {
        call_user("the instrument", sample.sample_index(i), [&] {
          draws source(seed, sample.sample_index(i), purpose::prediction);
          all[i].emplace(instrument.draw(truth_of<Instrument>(call(own, state)), source));
        });
      });
  return all;
}

}  // namespace detail

/// What the next reading of an instrument would show, given all that was read:
/// a weighted sample of faked readings, one for each state, under the same
/// weights. Ask it for an expectation, a coverage interval, a histogram.
/// @param where       readout of the true value
/// @param instrument  how it will be read
/// Assumes  that the next reading errs independently of those already weighed.
template <class X, class Readout, class Instrument>
auto next_reading(weighted_sample<X> const& sample, Readout const& where, Instrument const& instrument,
                  prediction_options const& options = {}) {
  auto made = detail::fakes(sample, where, instrument, options.seed);
  using fake = typename std::remove_cvref_t<decltype(made)>::value_type::value_type;
  std::size_t any = 0;
  while (!made[any].has_value()) ++any;  // some state has a positive weight
  detail::state_array<fake> readings;
  readings.reserve(made.size());
  for (auto const& each : made) readings.emplace_back(each ? *each : *made[any]);
  using store = detail::kept_states<fake, detail::state_array<fake>>;
  return weighted_sample<fake>(std::make_shared<store const>(std::move(readings)), sample.columns(), sample.origin(),
                               "next_reading");
}

}  // namespace steelyard::inline v1
