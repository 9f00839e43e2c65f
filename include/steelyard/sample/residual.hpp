// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <iterator>
#include <limits>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/multinomial.hpp>

namespace steelyard::inline v1::detail {

/// What residual resampling keeps for certain and what it leaves to chance.
struct residual_split {
  std::vector<std::size_t> kept;  ///< floor(k W_i) times position i, in rising order
  std::vector<double> rest;       ///< k W_i - floor(k W_i)
};

inline residual_split split_residual(std::span<double const> weights, std::size_t k) {
  double total = 0.0;
  for (double const w : weights) total += w;
  residual_split split;
  split.kept.reserve(k);
  split.rest.reserve(weights.size());
  for (std::size_t i = 0; i < weights.size(); ++i) {
    double const expected = weights[i] / total * static_cast<double>(k);
    // A whole number that rounding left just below itself counts as whole.
    auto const whole = static_cast<std::size_t>(expected * (1.0 + 4.0 * std::numeric_limits<double>::epsilon()));
    std::size_t const copies = std::min(whole, k - split.kept.size());
    split.kept.insert(split.kept.end(), copies, i);
    split.rest.push_back(std::max(0.0, expected - static_cast<double>(copies)));
  }
  return split;
}

/// Positions of k draws in rising order: the whole part of each expected number
/// of copies for certain, the rest by independent draws in proportion to the fractions.
///   unbiased; variance never above the multinomial one           [Douc, Cappe & Moulines 2005]
inline std::vector<std::size_t> residual_positions(std::span<double const> weights, std::size_t k, draws& source) {
  residual_split const split = split_residual(weights, k);
  if (split.kept.size() == k) return split.kept;
  std::vector<std::size_t> const drawn = multinomial_positions(split.rest, k - split.kept.size(), source);
  std::vector<std::size_t> positions(k);
  std::merge(split.kept.begin(), split.kept.end(), drawn.begin(), drawn.end(), positions.begin());
  return positions;
}

/// Variance of the mean over k residual draws, given weights and values: that
/// of the r draws left to chance, r^2/k^2 times the multinomial variance of their fractions.
inline double residual_variance(std::span<double const> weights, std::span<double const> values, std::size_t k) {
  residual_split const split = split_residual(weights, k);
  std::size_t const left = k - split.kept.size();
  if (left == 0) return 0.0;
  double const share = static_cast<double>(left) / static_cast<double>(k);
  return share * share * multinomial_variance(split.rest, values, left);
}

}  // namespace steelyard::inline v1::detail
