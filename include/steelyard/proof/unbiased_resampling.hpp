// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <vector>

#include <boost/math/distributions/normal.hpp>

#include <steelyard/base/count.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>

namespace steelyard::inline v1::proof {

struct resampling_options {
  count copies = 10;         ///< states drawn each time
  count repeats = 20'000;
  count seed = 1;
  double false_alarm = 1e-4;
};

/// Whether a resampler draws item i, on the mean, copies x W_i times.
///   resample(weights, copies, draws&) -> positions, any range of integers
///   the mean copies of each item against its expectation, by the standard error over the repeats; the false-alarm
///   rate is shared evenly among the items
template <class Resample>
check unbiased_resampling(Resample const& resample, std::span<double const> weights, resampling_options const& options = {}) {
  double const rate = detail::checked_rate("unbiased_resampling", options.false_alarm);
  double total = 0.0;
  for (double const w : weights) total += w;
  if (!(total > 0.0)) throw bad_argument("unbiased_resampling: the weights add up to nothing");
  if (options.repeats < 100u) throw bad_argument("unbiased_resampling: at least 100 repeats are needed");
  std::vector<double> sums(weights.size()), squares(weights.size());
  std::vector<std::uint64_t> copies(weights.size());
  for (std::uint64_t r = 0; r < options.repeats; ++r) {
    draws source(options.seed, r, purpose::calibration, 3);
    copies.assign(copies.size(), 0);
    std::uint64_t drawn = 0;
    for (auto const position : resample(weights, static_cast<std::size_t>(options.copies.value()), source)) {
      auto const i = static_cast<std::size_t>(position);
      if (i >= copies.size())
        return {outcome::failed, "repeat " + std::to_string(r) + " drew item " + std::to_string(i) + ", of which there are " +
                                     std::to_string(copies.size())};
      ++copies[i];
      ++drawn;
    }
    if (drawn != options.copies)
      return {outcome::failed, "repeat " + std::to_string(r) + " drew " + std::to_string(drawn) + " items where " +
                                   std::to_string(options.copies.value()) + " were asked for"};
    for (std::size_t i = 0; i < copies.size(); ++i) {
      double const expected = static_cast<double>(options.copies.value()) * (weights[i] / total);
      double const d = static_cast<double>(copies[i]) - expected;
      sums[i] += d;
      squares[i] += d * d;
    }
  }
  double const n = static_cast<double>(options.repeats.value());
  double const limit = quantile(complement(boost::math::normal_distribution<double, detail::quiet>(),
                                           0.5 * rate / static_cast<double>(weights.size())));
  double worst = 0.0;
  std::size_t at = 0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    double const gap = std::abs(sums[i] / n), se = std::sqrt(squares[i]) / n;
    double const off = gap <= 1e-12 * static_cast<double>(options.copies.value()) ? 0.0 : se > 0.0 ? gap / se : limit + 1.0;
    if (off > worst) {
      worst = off;
      at = i;
    }
  }
  std::string const text = "mean copies are off by at most " + detail::up::short_number(worst) + " standard errors, at item " +
                           std::to_string(at) + " (limit " + detail::up::short_number(limit) + ")";
  return {worst <= limit ? outcome::passed : outcome::failed, text};
}

}  // namespace steelyard::inline v1::proof
