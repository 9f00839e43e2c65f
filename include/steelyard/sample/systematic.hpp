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
/// uniform start: copies of i are the points j + u that fall below the running sum of k W.
///   unbiased; expected copies k W_i                          [Douc, Cappe & Moulines 2005]
/// Cost  about 1 ns a weight and a draw: four copies are written whether wanted or not, and the place moves on by as many
///       as count.
inline void systematic_positions(std::span<double const> weights, double u, std::span<std::size_t> positions) {
  std::size_t const k = positions.size(), last = last_position(weights);
  int const bits = share_bits(k);
  std::uint64_t const one = std::uint64_t{1} << bits;
  whole_shares const shares(weights, k * one);
  std::uint64_t sum = one - 1 - static_cast<std::uint64_t>(u * static_cast<double>(one));
  std::size_t from = 0, i = 0;
  std::size_t* const out = positions.data();
  for (; i < last && from + 4 <= k; ++i) {
    out[from] = out[from + 1] = out[from + 2] = out[from + 3] = i;
    std::size_t const to = static_cast<std::size_t>((sum += shares(weights[i])) >> bits);
    if (to > from + 4) [[unlikely]]
      std::fill(out + from + 4, out + std::min(to, k), i);
    from = to;
  }
  for (; i < last && from < k; ++i) {
    std::size_t const to = static_cast<std::size_t>((sum += shares(weights[i])) >> bits);
    if (to > from) std::fill(out + from, out + std::min(to, k), i);
    from = to;
  }
  if (from < k) std::fill(out + from, out + k, last);
}
inline std::vector<std::size_t> systematic_positions(std::span<double const> weights, std::size_t k, double u) {
  std::vector<std::size_t> positions(k);
  systematic_positions(weights, u, positions);
  return positions;
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
