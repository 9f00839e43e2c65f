// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>

#include <steelyard/draw/draws.hpp>
#include <steelyard/weigh/likelihood.hpp>

namespace steelyard::inline v1 {

/// How a reading errs: `score(reading, truth)` gives its log-likelihood with all
/// constants in, `draw(truth, draws)` fakes one. Optional beside them:
/// `truth_type`, what the state's true value is converted to; `check(reading)`,
/// which throws `bad_argument` for one that can never be shown; `scale()`, the
/// size of its typical error; `name()`.
template <class Instrument, class Reading, class Truth>
concept instrument_for = requires(Instrument const& instrument, Reading const& reading, Truth const& truth, draws& d) {
  { instrument.score(reading, truth) } -> std::same_as<log_likelihood>;
  instrument.draw(truth, d);
};

}  // namespace steelyard::inline v1
