// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace steelyard::inline v1::detail {

/// Where k points of [0, 1) that come in rising order fall among the weights, laid end to end.
/// @param point  point(j) for j = 0 .. k - 1, called once each and in turn
template <class Point>
std::vector<std::size_t> positions_at(std::span<double const> weights, std::size_t k, Point point) {
  double total = 0.0;
  std::size_t last = 0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    total += weights[i];
    if (weights[i] > 0.0) last = i;
  }
  std::vector<std::size_t> positions;
  positions.reserve(k);
  double sum = 0.0, next = point(std::size_t{0}) * total;
  for (std::size_t i = 0; i <= last && positions.size() < k; ++i) {
    sum += weights[i];
    while (positions.size() < k && next < sum) {
      positions.push_back(i);
      if (positions.size() < k) next = point(positions.size()) * total;
    }
  }
  positions.resize(k, last);
  return positions;
}

}  // namespace steelyard::inline v1::detail
