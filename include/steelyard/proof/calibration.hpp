// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <exception>
#include <optional>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/pool.hpp>
#include <steelyard/proof/progress.hpp>
#include <steelyard/proof/uniformity.hpp>
#include <steelyard/weigh/callable.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::proof {

struct calibration_options {
  count repeats = 1'000;      ///< truths drawn
  count size = 200;           ///< prior draws weighed for each
  count seed = 1;
  double false_alarm = 1e-4;
  std::size_t bins = 20;
  steelyard::executor executor = {};
  proof::progress progress = {};
  count budget = 0;           ///< calls of the prior at most, by fewer repeats; 0: repeats x (size + 1)
};

/// A calibration check with its numbers.
class calibration_check : public check {
 public:
  calibration_check(outcome what, std::string sentence, std::vector<double> positions, uniformity numbers,
                    std::uint64_t sampler_calls)
      : check(what, std::move(sentence)), positions_(std::move(positions)), numbers_(std::move(numbers)),
        sampler_calls_(sampler_calls) {}

  /// Position of each true value among its weighted draws, in [0, 1].
  [[nodiscard]] std::span<double const> positions() const noexcept { return positions_; }
  [[nodiscard]] uniformity const& numbers() const noexcept { return numbers_; }
  [[nodiscard]] std::uint64_t sampler_calls() const noexcept { return sampler_calls_; }

 private:
  std::vector<double> positions_;
  uniformity numbers_;
  std::uint64_t sampler_calls_;
};

namespace detail {

/// The truth of a repeat: a state of the prior given that it makes one.
/// @throws bad_argument where a thousand runs in a row return none.
template <class Prior>
state_of_t<Prior> draw_truth(Prior const& prior, draws& source, std::uint64_t& calls) {
  if constexpr (up::unwrap_optional<up::result_t<Prior, draws&>>::may_be_empty) {
    for (int tried = 0; tried < 1'000; ++tried, ++calls)
      if (auto made = up::call(prior, source)) return *std::move(made);
    throw bad_argument("calibration: the prior returned no state in 1000 runs in a row");
  } else {
    return up::call(prior, source);
  }
}

/// What one repeat found.
struct repeat_result {
  double position = 0.0;
  std::uint64_t calls = 0;  // of the prior
  bool possible = true;     // by the weighter of its own reading
};

/// One truth, its reading, and its position among weighed draws.
template <class Prior, class Simulate, class WeighterFor, class Readout>
repeat_result place_truth(Prior const& prior, Simulate const& simulate, WeighterFor const& weighter_for_reading,
                          Readout const& readout, std::uint64_t seed, std::uint64_t r, std::size_t size,
                          reading_log& log) {
  using state = state_of_t<Prior>;
  draws of_truth(seed, r, purpose::calibration, 0), of_reading(seed, r, purpose::calibration, 1);
  repeat_result result;
  result.calls = size + 1;
  state const truth = draw_truth(prior, of_truth, result.calls);
  auto const reading = up::call(simulate, truth, of_reading);
  log.set(static_cast<std::size_t>(r), reading);
  auto const weighter = up::call(weighter_for_reading, reading);
  using weighter_type = std::remove_cvref_t<decltype(weighter)>;
  static_assert(weighter_for<weighter_type, state>,
                "steelyard: what calibration() gets for a reading must be a weighter of the prior's states");
  up::instance_t<weighter_type> scorer = up::instance_of<weighter_type>::make(weighter);
  auto const weigh = [&](state const& x) {
    double row[up::item_count<weighter_type>()];
    up::score_items(scorer, x, std::span<double>(row));
    return up::total_log(0.0, row);
  };
  auto const read = [&](state const& x) {
    double const value = static_cast<double>(up::call(readout, x));
    if (!up::is_finite(value)) throw bad_readout("the readout " + up::plain_number(value) + " is not a finite number");
    return value;
  };
  double const truth_log = weigh(truth);
  result.possible = truth_log > up::impossible;
  if (!result.possible) return result;
  std::vector<double> logs, values;
  draws each(seed);
  for (std::size_t i = 0; i < size; ++i) {
    up::draws_access::seat(each, seed, r * size + i, purpose::calibration, 2);
    auto&& made = up::call(prior, each);
    state const* x = nullptr;
    if constexpr (up::unwrap_optional<up::result_t<Prior, draws&>>::may_be_empty)
      x = made ? &*made : nullptr;
    else
      x = &made;
    double const log_weight = x != nullptr ? weigh(*x) : up::impossible;
    if (!(log_weight > up::impossible)) continue;
    logs.push_back(log_weight);
    values.push_back(read(*x));
  }
  result.position = pool_position(std::move(logs), values, truth_log, read(truth), of_reading.uniform());
  return result;
}

/// Calls `act`; what it throws comes out nested in a sentence that names the repeat.
template <class Act>
auto in_repeat(std::uint64_t r, Act act) {
  try {
    return act();
  } catch (std::exception const& e) {
    throw failed_sample("calibration: repeat " + std::to_string(r) + " failed: " + e.what(), r);
  } catch (...) {
    throw failed_sample(
        "calibration: repeat " + std::to_string(r) + " failed with an exception that is no std::exception", r);
  }
}

}  // namespace detail

/// Whether a whole model is calibrated: truths are drawn from the prior, a
/// reading is simulated for each, prior draws are weighed by it, and the truth's
/// position among them must be uniform. With the truth in the pool this is
/// exact at every size, where ranks of resampled draws are biased.
///                                                        [idea: Talts et al. 2018, arXiv 1804.06788]
///   prior              state X(draws&), or std::optional of one: then the prior given a state
///   simulate_reading   reading Y(X const&, draws&)
///   weighter_for       from Y to a weighter of X
///   readout            from X to a number, or an event
/// @throws bad_argument for fewer than five repeats a bin; failed_sample, by repeat, for what user code throws.
/// Cost  repeats x (size + 1) calls of the prior and of the weighter.
template <class Prior, class Simulate, class WeighterFor, class Readout>
calibration_check calibration(Prior const& prior, Simulate const& simulate_reading,
                              WeighterFor const& weighter_for_reading, Readout const& readout,
                              calibration_options const& options = {}) {
  static_assert(sampler<Prior>,
                "steelyard: calibration() takes a prior that is called with draws& and returns a state");
  using state = state_of_t<Prior>;
  static_assert(detail::up::is_number_v<detail::up::result_t<Readout, state const&>>,
                "steelyard: calibration() takes a readout that returns one number");
  static_assert(detail::up::callable_v<Simulate, state const&, draws&>,
                "steelyard: calibration() takes a simulate_reading that is called with a state and draws&");
  using reading = detail::up::result_t<Simulate, state const&, draws&>;
  double const rate = detail::checked_rate("calibration", options.false_alarm);
  std::uint64_t const size = options.size;
  std::uint64_t repeats = options.repeats;
  if (options.budget > 0u) repeats = std::min(repeats, options.budget.value() / (size + 1));
  if (options.bins < 2 || repeats < 5 * options.bins || size == 0)
    throw bad_argument("calibration: " + std::to_string(repeats) + " repeats of size " + std::to_string(size) + " in " +
                       std::to_string(options.bins) + " bins; it needs two bins, five repeats a bin and one draw");
  std::vector<detail::repeat_result> results(static_cast<std::size_t>(repeats));
  detail::reading_log log(results.size());
  detail::up::first_failure failure;
  detail::repeat_counter done(options.progress, repeats);
  constexpr std::uint64_t task = 32;
  options.executor(static_cast<std::size_t>((repeats + task - 1) / task), [&](std::size_t t) {
    detail::up::instance_t<Prior> draw = detail::up::instance_of<Prior>::make(prior);
    detail::up::instance_t<Simulate> simulate = detail::up::instance_of<Simulate>::make(simulate_reading);
    std::uint64_t const end = std::min(repeats, (t + 1) * task);
    for (std::uint64_t r = t * task; r < end && !failure.before(r); ++r)
      failure.guard(r, [&] {
        results[static_cast<std::size_t>(r)] = detail::in_repeat(r, [&] {
          return detail::place_truth(draw, simulate, weighter_for_reading, readout, options.seed, r,
                                     static_cast<std::size_t>(size), log);
        });
      });
    done.add(end - t * task);
  });
  failure.rethrow();
  std::vector<double> positions;
  std::uint64_t calls = 0;
  std::string impossible_at;
  for (detail::repeat_result const& each : results) {
    if (!each.possible && impossible_at.empty()) impossible_at = std::to_string(&each - results.data());
    calls += each.calls;
    positions.push_back(each.position);
  }
  uniformity u = test_uniform(positions, options.bins, rate);
  if (!impossible_at.empty())
    return {outcome::failed,
            "in repeat " + impossible_at + " the weighter calls the truth behind its own reading impossible",
            std::move(positions), std::move(u), calls};
  bool const fine = u.chi_square_chance >= 0.5 * rate && !u.left_envelope;
  std::string text = std::to_string(repeats) + " true values lie " + (fine ? "evenly" : "unevenly") +
                     " among their draws (chi-square " + detail::up::short_number(u.chi_square) + " on " +
                     detail::up::short_number(u.degrees) + " degrees, " + (u.left_envelope ? "outside" : "inside") +
                     " the exact envelope)";
  if (!fine)
    text += ": the posterior is " + u.direction + "; " +
            (detail::reading_log::tells<reading> ? log.worst(positions) : detail::worst_repeats(positions));
  return {fine ? outcome::passed : outcome::failed, std::move(text), std::move(positions), std::move(u), calls};
}

}  // namespace steelyard::inline v1::proof
