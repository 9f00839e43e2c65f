// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Positions of k independent draws in rising order: sorted uniforms from
/// exponential spacings, then one walk.
///   U_(j) = (E_1 + ... + E_j) / (E_1 + ... + E_(k+1))       [Devroye, Non-Uniform Random Variate Generation, 1986, ch. V]
inline std::vector<std::size_t> multinomial_positions(std::span<double const> weights, std::size_t k, draws& source) {
  std::vector<double> at(k);
  double spacings = 0.0;
  for (double& each : at) each = spacings += source.exponential(1.0);
  spacings += source.exponential(1.0);
  return positions_at(weights, k, [&](std::size_t j) { return at[j] / spacings; });
}

/// Variance of the mean over k independent draws, given weights and values: sum W (f - mu)^2 / k.
inline double multinomial_variance(std::span<double const> weights, std::span<double const> values, std::size_t k) {
  double sum = 0.0, mean = 0.0, second = 0.0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    if (!(weights[i] > 0.0)) continue;
    double const gap = values[i] - mean;
    sum += weights[i];
    mean += gap * (weights[i] / sum);
    second += weights[i] * gap * (values[i] - mean);
  }
  return sum > 0.0 ? second / sum / static_cast<double>(k) : 0.0;
}

}  // namespace steelyard::inline v1::detail
