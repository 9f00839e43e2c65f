// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/user_code.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/uniformity.hpp>
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
  std::function<void(std::uint64_t done, std::uint64_t repeats)> progress = {};
};

/// A calibration check with its numbers.
class calibration_check : public check {
 public:
  calibration_check(outcome what, std::string sentence, std::vector<double> positions, uniformity numbers)
      : check(what, std::move(sentence)), positions_(std::move(positions)), numbers_(std::move(numbers)) {}

  /// Position of each true value among its weighted draws, in [0, 1].
  [[nodiscard]] std::span<double const> positions() const noexcept { return positions_; }
  [[nodiscard]] uniformity const& numbers() const noexcept { return numbers_; }

 private:
  std::vector<double> positions_;
  uniformity numbers_;
};

namespace detail {

/// Position of the truth in its pool: (sum w below + V (w_truth + w ties)) / (sum w + w_truth).
inline double pool_position(std::vector<double> logs, std::span<double const> values, double truth_log, double truth, double v) {
  logs.push_back(truth_log);
  double const maximum = up::block_maximum(logs);
  if (!(maximum > up::impossible)) return v;
  std::vector<double> weights(logs.size());
  up::weights_from_logs(logs, maximum, weights);
  double below = 0.0, tied = weights.back(), total = weights.back();
  for (std::size_t i = 0; i < values.size(); ++i) {
    total += weights[i];
    if (values[i] < truth) below += weights[i];
    if (values[i] == truth) tied += weights[i];
  }
  double const position = (below + v * tied) / total;
  return position < 1.0 ? position : 1.0;
}

template <class Reading>
std::string shown_reading(Reading const& reading) {
  if constexpr (std::is_convertible_v<Reading, double>)
    return up::plain_number(static_cast<double>(reading));
  else
    return "of its own kind";
}

}  // namespace detail

/// Whether a whole model is calibrated: truths are drawn from the prior, a
/// reading is simulated for each, prior draws are weighed by it, and the truth's
/// position among them must be uniform. With the truth in the pool this is
/// exact at every size, where ranks of resampled draws are biased.
///                                                        [idea: Talts et al. 2018, arXiv 1804.06788]
///   prior              state X(draws&)
///   simulate_reading   reading Y(X const&, draws&)
///   weighter_for       from Y to a weighter of X
///   readout            from X to a number
/// Cost  repeats x (size + 1) calls of the prior and of the weighter.
template <class Prior, class Simulate, class WeighterFor, class Readout>
calibration_check calibration(Prior const& prior, Simulate const& simulate_reading, WeighterFor const& weighter_for_reading,
                              Readout const& readout, calibration_options const& options = {}) {
  using state = state_of_t<Prior>;
  static_assert(readout_for<Readout, state>, "steelyard: calibration() takes a readout that returns one number");
  double const rate = detail::checked_rate("calibration", options.false_alarm);
  std::size_t const repeats = static_cast<std::size_t>(options.repeats.value());
  std::size_t const size = static_cast<std::size_t>(options.size.value());
  if (options.bins < 2 || repeats < 5 * options.bins || size == 0)
    throw bad_argument("calibration: " + std::to_string(repeats) + " repeats of size " + std::to_string(size) + " in " +
                       std::to_string(options.bins) + " bins; it needs two bins, five repeats a bin and one draw");
  std::vector<double> positions(repeats);
  std::vector<std::string> readings(repeats);
  detail::up::first_failure failure;
  std::size_t const task = 32, tasks = (repeats + task - 1) / task;
  options.executor(tasks, [&](std::size_t t) {
    for (std::size_t r = t * task; r < std::min(repeats, (t + 1) * task); ++r)
      failure.guard(r, [&] {
        draws of_truth(options.seed, r, purpose::calibration, 0), of_reading(options.seed, r, purpose::calibration, 1);
        auto&& truth = std::invoke(prior, of_truth);
        auto const reading = std::invoke(simulate_reading, std::as_const(truth), of_reading);
        auto const weighter = std::invoke(weighter_for_reading, reading);
        constexpr std::size_t items = detail::up::item_count<std::remove_cvref_t<decltype(weighter)>>();
        auto const log_weight = [&](state const& x) {
          double row[items];
          detail::up::score_items(weighter, x, std::span<double>(row));
          return detail::up::total_log(0.0, row);
        };
        std::vector<double> logs, values;
        draws each(options.seed);
        for (std::size_t i = 0; i < size; ++i) {
          detail::up::draws_access::seat(each, options.seed, r * size + i, purpose::calibration, 2);
          auto&& x = std::invoke(prior, each);
          logs.push_back(log_weight(x));
          values.push_back(static_cast<double>(std::invoke(readout, std::as_const(x))));
        }
        positions[r] = detail::pool_position(std::move(logs), values, log_weight(truth),
                                             static_cast<double>(std::invoke(readout, std::as_const(truth))), of_reading.uniform());
        readings[r] = detail::shown_reading(reading);
      });
    if (options.progress) options.progress(std::min(repeats, (t + 1) * task), repeats);
  });
  failure.rethrow();
  uniformity const u = test_uniform(positions, options.bins, rate);
  bool const fine = u.chi_square_chance >= 0.5 * rate && !u.left_envelope;
  std::string text = std::to_string(repeats) + " true values lie " + (fine ? "evenly" : "unevenly") + " among their draws (chi-square " +
                     detail::up::short_number(u.chi_square) + " on " + detail::up::short_number(u.degrees) + " degrees, " +
                     (u.left_envelope ? "outside" : "inside") + " the exact envelope)";
  if (!fine) {
    std::vector<std::size_t> order(repeats);
    for (std::size_t r = 0; r < repeats; ++r) order[r] = r;
    auto const edge = [&](std::size_t r) { return std::min(positions[r], 1.0 - positions[r]); };
    std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return edge(a) < edge(b); });
    text += ": the posterior is " + u.direction + "; worst at readings ";
    for (std::size_t k = 0; k < 3; ++k)
      text += (k > 0 ? ", " : "") + readings[order[k]] + " (repeat " + std::to_string(order[k]) + ", position " +
              detail::up::short_number(positions[order[k]]) + ")";
  }
  return {fine ? outcome::passed : outcome::failed, std::move(text), std::move(positions), u};
}

}  // namespace steelyard::inline v1::proof
