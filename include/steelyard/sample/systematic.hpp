// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Positions of k draws in rising order, by steps of equal length from one
/// uniform start.
///   unbiased; expected copies k W_i                          [Douc, Cappe & Moulines 2005]
inline std::vector<std::size_t> systematic_positions(std::span<double const> weights, std::size_t k, double u) {
  return positions_at(weights, k, [&](std::size_t j) { return (static_cast<double>(j) + u) / static_cast<double>(k); });
}

/// Variance of the mean over k systematic draws, given weights and values: exact,
/// since the mean is a step function of the one uniform number.
///   k M(U) = const - sum_i (f_i - f_(i+1)) 1{U > frac(k C_i)}
/// Cost  one sort of the fractions.
inline double systematic_variance(std::span<double const> weights, std::span<double const> values, std::size_t k) {
  double total = 0.0;
  for (double const w : weights) total += w;
  struct jump {
    double at, size;
  };
  std::vector<jump> jumps;
  double sum = 0.0, before = 0.0;
  bool any = false;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    if (!(weights[i] > 0.0)) continue;
    if (any) {
      double const place = sum / total * static_cast<double>(k);
      jumps.push_back({place - static_cast<double>(static_cast<std::uint64_t>(place)), values[i] - before});
    }
    sum += weights[i];
    before = values[i];
    any = true;
  }
  std::sort(jumps.begin(), jumps.end(), [](jump const& a, jump const& b) { return a.at < b.at; });
  double level = 0.0, start = 0.0, mean = 0.0;
  for (jump const& each : jumps) {
    mean += level * (each.at - start);
    level += each.size;
    start = each.at;
  }
  mean += level * (1.0 - start);
  double variance = 0.0;
  level = start = 0.0;
  for (jump const& each : jumps) {
    variance += (level - mean) * (level - mean) * (each.at - start);
    level += each.size;
    start = each.at;
  }
  variance += (level - mean) * (level - mean) * (1.0 - start);
  return variance / (static_cast<double>(k) * static_cast<double>(k));
}

}  // namespace steelyard::inline v1::detail
