// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <cstring>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/exponential_words.hpp>
#include <steelyard/base/isa.hpp>
#include <steelyard/base/lanes.hpp>
#include <steelyard/base/share_lanes.hpp>
#include <steelyard/base/sums.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/positions.hpp>

namespace steelyard::inline v1::detail {

/// Positions of k independent draws in rising order: sorted uniforms from
/// exponential spacings, then one walk.
///   U_(j) = (E_1 + ... + E_j) / (E_1 + ... + E_(k+1))       [Devroye, Non-Uniform Random Variate Generation, 1986, ch. V]
/// Cost  one word a draw, about 7 ns a weight and a draw in all; no memory beside the positions.
inline void multinomial_positions(std::span<double const> weights, draws& source, std::span<std::size_t> positions,
                                  isa width = widest_isa()) {
  constexpr std::size_t stretch = 256, batch = 4 * stretch;
  constexpr std::uint64_t whole = std::uint64_t{1} << 62;
  std::size_t const k = positions.size();
  std::uint64_t words[batch];
  double spacings[batch];
  pairwise_sum<double> sums;  // of stretches
  for (std::size_t at = 0; at <= k; at += batch) {
    std::size_t const n = std::min(batch, k + 1 - at), up = (n + virtual_lanes - 1) / virtual_lanes * virtual_lanes;
    draws_access::fill(source, std::span<std::uint64_t>(words, n));
    std::fill(words + n, words + up, ~std::uint64_t{0});
    exponentials_from_words(std::span<std::uint64_t const>(words, up), std::span<double>(spacings, up), width);
    std::size_t const kept = std::min(n, k - at);
    if (kept > 0) std::memcpy(positions.data() + at, spacings, kept * sizeof(double));  // turned to points below
    if (n == batch) {  // four sums side by side
      double a = 0.0, b = 0.0, c = 0.0, d = 0.0;
      for (double const* s = spacings; s != spacings + stretch; ++s) {
        a += s[0];
        b += s[stretch];
        c += s[2 * stretch];
        d += s[3 * stretch];
      }
      for (double const sum : {a, b, c, d}) sums.add(sum);
    } else {
      for (std::size_t from = 0; from < n; from += stretch) {
        double sum = 0.0;
        for (std::size_t w = from; w < std::min(from + stretch, n); ++w) sum += spacings[w];
        sums.add(sum);
      }
    }
  }
  double const factor = static_cast<double>(whole) / sums.total();
  std::uint64_t point = 0;
  lay_out(weights, whole, positions, [&](std::size_t from, std::size_t n, std::uint64_t* points) {
    std::size_t const groups = n / virtual_lanes, rest = n % virtual_lanes;
    std::size_t* const here = positions.data() + from;
    point = running_sums(width, reinterpret_cast<double const*>(here), 1.0, factor, point, 0, points, groups);
    if (rest == 0) return;
    double few[virtual_lanes] = {};
    std::memcpy(few, here + n - rest, rest * sizeof(double));
    point = running_sums(width, few, 1.0, factor, point, 0, points + n - rest, 1);
  }, width);
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
