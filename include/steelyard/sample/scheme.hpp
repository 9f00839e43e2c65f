// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>

namespace steelyard::inline v1 {

/// How states are drawn in proportion to their weights.
enum class scheme {
  systematic,   ///< one uniform number and equal steps: copies differ from k W by less than one
  multinomial,  ///< independently
};

struct resample_options {
  count seed = 1;
  steelyard::scheme scheme = steelyard::scheme::systematic;
  bool shuffled = true;  ///< slots in random order, so that any part of them is a fair sample
};

namespace detail {

/// Positions of k draws in rising order, by steps of equal length from one
/// uniform start.
///   unbiased; expected copies k W_i                          [Douc, Cappe & Moulines 2005]
inline std::vector<std::size_t> systematic_positions(std::span<double const> weights, std::size_t k, double u) {
  double total = 0.0;
  std::size_t last = 0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    total += weights[i];
    if (weights[i] > 0.0) last = i;
  }
  std::vector<std::size_t> positions;
  positions.reserve(k);
  double const step = total / static_cast<double>(k);
  double sum = 0.0;
  for (std::size_t i = 0; i <= last && positions.size() < k; ++i) {
    sum += weights[i];
    while (positions.size() < k && (static_cast<double>(positions.size()) + u) * step < sum) positions.push_back(i);
  }
  positions.resize(k, last);
  return positions;
}

/// Positions of k independent draws in rising order: sorted uniforms from
/// exponential spacings, then one walk.
///   U_(j) = (E_1 + ... + E_j) / (E_1 + ... + E_(k+1))       [Devroye, Non-Uniform Random Variate Generation, 1986, ch. V]
inline std::vector<std::size_t> multinomial_positions(std::span<double const> weights, std::size_t k, draws& source) {
  double total = 0.0;
  std::size_t last = 0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    total += weights[i];
    if (weights[i] > 0.0) last = i;
  }
  std::vector<double> at(k);
  double spacings = 0.0;
  for (double& each : at) each = spacings += source.exponential(1.0);
  spacings += source.exponential(1.0);
  std::vector<std::size_t> positions;
  positions.reserve(k);
  double sum = 0.0;
  for (std::size_t i = 0; i <= last && positions.size() < k; ++i) {
    sum += weights[i];
    while (positions.size() < k && at[positions.size()] / spacings * total < sum) positions.push_back(i);
  }
  positions.resize(k, last);
  return positions;
}

/// Random order, each as likely.                               [Fisher & Yates 1938; Durstenfeld 1964]
template <class T>
void shuffle(std::vector<T>& all, draws& source) {
  for (std::size_t i = all.size(); i > 1; --i) std::swap(all[i - 1], all[static_cast<std::size_t>(source.index(i))]);
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

}  // namespace detail

}  // namespace steelyard::inline v1
