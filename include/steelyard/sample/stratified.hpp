// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Positions of k draws in rising order, one uniform number in each of k equal strata.
///   unbiased; variance never above the multinomial one           [Douc, Cappe & Moulines 2005]
inline std::vector<std::size_t> stratified_positions(std::span<double const> weights, std::size_t k, draws& source) {
  int const bits = share_bits(k);
  std::vector<std::size_t> positions(k);
  lay_out(weights, std::uint64_t{k} << bits, positions, [&](std::size_t from, std::size_t n, std::uint64_t* points) {
    draws_access::fill(source, std::span<std::uint64_t>(points, n));
    for (std::size_t j = 0; j < n; ++j) points[j] = (std::uint64_t{from + j} << bits) + (points[j] >> (64 - bits));
  });
  return positions;
}

/// Variance of the mean over k stratified draws, given weights and values:
///   1/k^2 sum over strata of the variance within
inline double stratified_variance(std::span<double const> weights, std::span<double const> values, std::size_t k) {
  double total = 0.0;
  for (double const w : weights) total += w;
  double const step = total / static_cast<double>(k);
  double variance = 0.0, mean = 0.0, second = 0.0, filled = 0.0;  // of the stratum at hand, centred
  std::size_t done = 0;
  double sum = 0.0;
  auto const take = [&](double part, double f) {
    if (!(part > 0.0)) return;
    double const gap = f - mean;
    filled += part;
    mean += gap * (part / filled);
    second += part * gap * (f - mean);
  };
  for (std::size_t i = 0; i < weights.size(); ++i) {
    double from = sum;
    sum += weights[i];
    for (double edge; done + 1 < k && (edge = static_cast<double>(done + 1) * step) <= sum; ++done) {
      take(edge - from, values[i]);
      variance += filled > 0.0 ? second / filled : 0.0;
      mean = second = filled = 0.0;
      from = edge;
    }
    take(sum - from, values[i]);
  }
  variance += filled > 0.0 ? second / filled : 0.0;
  return variance / (static_cast<double>(k) * static_cast<double>(k));
}

}  // namespace steelyard::inline v1::detail
