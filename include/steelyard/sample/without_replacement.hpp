// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>

namespace steelyard::inline v1::detail {

/// Positions of slots in rising order; weights empty where all slots are equal.
struct drawn_slots {
  std::vector<std::size_t> positions;
  std::vector<double> weights;
};

/// At most k positions, each once: those with the k largest keys w/R, R uniform
/// (priority sampling) or exponential (successive draws in proportion to what is left).
///   With z the next largest key, an entry stays with probability min(1, w/z), or 1 - exp(-w/z), whatever the others
///   did; its weight over that probability is max(w, z), or w / (1 - exp(-w/z)). Over the total of all weights these
///   are unbiased, sum by sum, and uncorrelated; with no more than k entries of positive weight they are exact.
///       [Duffield, Lund & Thorup, J. ACM 54(6), 2007; Efraimidis & Spirakis, Inf. Process. Lett. 97, 2006;
///        Cohen & Kaplan, PODC 2007, for the weights of the second]
inline drawn_slots drawn_once(std::span<double const> weights, std::size_t k, bool successive, draws& source) {
  struct entry {
    double key;
    std::size_t position;
  };
  std::vector<entry> entries;
  double total = 0.0;
  for (std::size_t i = 0; i < weights.size(); ++i) {
    if (!(weights[i] > 0.0)) continue;
    total += weights[i];
    entries.push_back({weights[i] / (successive ? source.exponential(1.0) : source.uniform()), i});
  }
  double next = 0.0;
  if (entries.size() > k) {
    auto const kth = entries.begin() + static_cast<std::ptrdiff_t>(k);
    std::nth_element(entries.begin(), kth, entries.end(), [](entry const& a, entry const& b) {
      return a.key != b.key ? a.key > b.key : a.position < b.position;
    });
    next = kth->key;
    entries.resize(k);
  }
  std::sort(entries.begin(), entries.end(), [](entry const& a, entry const& b) { return a.position < b.position; });
  drawn_slots slots;
  for (entry const& each : entries) {
    double const w = weights[each.position];
    double const stays = !(next > w * 1e-3) ? 1.0 : successive ? -portable_expm1(-w / next) : w < next ? w / next : 1.0;
    slots.positions.push_back(each.position);
    slots.weights.push_back(w / stays / total);
  }
  return slots;
}

}  // namespace steelyard::inline v1::detail
