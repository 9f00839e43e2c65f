// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <boost/math/distributions/normal.hpp>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/progress.hpp>

namespace steelyard::inline v1::proof {

struct resampling_options {
  count copies = 10;         ///< states drawn each time
  count repeats = 20'000;
  count seed = 1;
  double false_alarm = 1e-4;
  proof::progress progress = {};
};

/// Whether a resampler draws item i, on the mean, copies x W_i times.
///   resample(weights, copies, draws&) -> positions, any range of integers
///   the mean copies of each item against its expectation, by the standard error over the repeats; the false-alarm
///   rate is shared evenly among the items. The variance of a whole number with fraction f in its mean is f(1 - f) at
///   least, and the standard error is taken to be no smaller than that allows.
/// An item expected so seldom that its absence would not show makes the check unable to certify.
/// @throws bad_argument for weights that are negative, not finite or nothing in all, no copies, or under 100 repeats.
/// Cost  repeats calls of the resampler.
template <class Resample>
check unbiased_resampling(Resample const& resample, std::span<double const> weights,
                          resampling_options const& options = {}) {
  double const rate = detail::checked_rate("unbiased_resampling", options.false_alarm);
  double total = 0.0;
  for (double const w : weights) {
    if (!detail::up::is_finite(w) || w < 0.0)
      throw bad_argument("unbiased_resampling: the weight " + detail::up::plain_number(w) +
                         " must be zero or a positive finite number");
    total += w;
  }
  if (!(total > 0.0)) throw bad_argument("unbiased_resampling: the weights add up to nothing");
  if (options.copies == 0u) throw bad_argument("unbiased_resampling: at least one copy is needed");
  if (options.repeats < 100u)
    throw bad_argument("unbiased_resampling: " + std::to_string(options.repeats.value()) +
                       " repeats were asked for; at least 100 are needed");
  double const wanted = static_cast<double>(options.copies.value());
  std::vector<double> expected, sums(weights.size()), squares(weights.size());
  for (double const w : weights) expected.push_back(wanted * (w / total));
  std::vector<std::uint64_t> copies(weights.size());
  detail::repeat_counter done(options.progress, options.repeats);
  for (std::uint64_t r = 0; r < options.repeats; ++r) {
    draws source(options.seed, r, purpose::calibration, 3);
    copies.assign(copies.size(), 0);
    std::uint64_t drawn = 0;
    for (auto const position : resample(weights, static_cast<std::size_t>(options.copies.value()), source)) {
      auto const i = static_cast<std::size_t>(position);
      if (i >= copies.size())
        return {outcome::failed, "repeat " + std::to_string(r) + " drew item " + std::to_string(i) +
                                     ", of which there are " + std::to_string(copies.size())};
      if (weights[i] == 0.0)
        return {outcome::failed,
                "repeat " + std::to_string(r) + " drew item " + std::to_string(i) + ", whose weight is zero"};
      ++copies[i];
      ++drawn;
    }
    if (drawn != options.copies)
      return {outcome::failed, "repeat " + std::to_string(r) + " drew " + std::to_string(drawn) + " items where " +
                                   std::to_string(options.copies.value()) + " were asked for"};
    for (std::size_t i = 0; i < copies.size(); ++i) {
      double const d = static_cast<double>(copies[i]) - expected[i];
      sums[i] += d;
      squares[i] += d * d;
    }
    if ((r + 1) % 100 == 0 || r + 1 == options.repeats) done.add(r % 100 + 1);
  }
  double const n = static_cast<double>(options.repeats.value());
  double const limit = quantile(complement(boost::math::normal_distribution<double, detail::quiet>(),
                                           0.5 * rate / static_cast<double>(weights.size())));
  double worst = 0.0;
  std::size_t at = 0, rare = weights.size();
  for (std::size_t i = 0; i < weights.size(); ++i) {
    if (weights[i] == 0.0) continue;
    double const fraction = expected[i] - std::floor(expected[i]);
    double const variance = std::max(squares[i] / n, fraction * (1.0 - fraction)), se = std::sqrt(variance / n);
    double const gap = std::abs(sums[i] / n), off = gap <= 1e-12 * wanted ? 0.0 : gap / se;
    if (off > worst) {
      worst = off;
      at = i;
    }
    if (n * expected[i] < limit * limit && rare == weights.size()) rare = i;
  }
  std::string text = "mean copies are off by at most " + detail::up::short_number(worst) +
                     " standard errors, at item " + std::to_string(at) + " (limit " + detail::up::short_number(limit) +
                     ")";
  if (worst > limit) return {outcome::failed, std::move(text)};
  if (rare < weights.size())
    return {outcome::cannot_certify, text + ", but item " + std::to_string(rare) + " is expected " +
                                         detail::up::short_number(n * expected[rare]) +
                                         " times in all, too seldom to be missed: cannot certify"};
  return {outcome::passed, std::move(text)};
}

}  // namespace steelyard::inline v1::proof
