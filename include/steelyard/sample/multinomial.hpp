// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/exponential_words.hpp>
#include <steelyard/base/sums.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Positions of k independent draws in rising order: sorted uniforms from
/// exponential spacings, then one walk.
///   U_(j) = (E_1 + ... + E_j) / (E_1 + ... + E_(k+1))       [Devroye, Non-Uniform Random Variate Generation, 1986, ch. V]
/// Cost  one word a draw; no memory beside the positions.
inline void multinomial_positions(std::span<double const> weights, draws& source, std::span<std::size_t> positions) {
  constexpr std::size_t batch = 256;
  constexpr std::uint64_t whole = std::uint64_t{1} << 62;
  std::size_t const k = positions.size();
  std::uint64_t words[batch];
  double spacings[batch];
  pairwise_sum<double> sums;
  for (std::size_t at = 0; at <= k; at += batch) {
    std::size_t const n = std::min(batch, k + 1 - at);
    for (std::size_t w = 0; w < batch; ++w) words[w] = w < n ? source() : ~std::uint64_t{0};
    exponentials_from_words(words, spacings);
    double sum = 0.0;
    for (std::size_t w = 0; w < n; ++w) sum += spacings[w];
    sums.add(sum);
    std::size_t const kept = std::min(n, k - at);
    if (kept > 0) std::memcpy(positions.data() + at, spacings, kept * sizeof(double));  // turned to points below
  }
  double const factor = static_cast<double>(whole) / sums.total();
  std::uint64_t point = 0;
  for (std::size_t& each : positions)
    each = point += static_cast<std::uint64_t>(static_cast<std::int64_t>(std::bit_cast<double>(std::uint64_t{each}) * factor + 0.5));
  points_to_positions(weights, whole, positions);
}
inline std::vector<std::size_t> multinomial_positions(std::span<double const> weights, std::size_t k, draws& source) {
  std::vector<std::size_t> positions(k);
  multinomial_positions(weights, source, positions);
  return positions;
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
