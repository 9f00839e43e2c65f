// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <memory>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/sample/ensemble.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1::detail {

/// Weights relative to the largest, counts taken in.
template <class X>
std::vector<double> plain_weights(weighted_sample<X> const& sample) {
  std::span<double const> const logs = sample.log_weights();
  std::vector<double> weights(logs.size());
  weights_from_logs(logs, block_maximum(logs), weights);
  std::vector<std::uint64_t> const& counts = sample.origin()->counts;
  for (std::size_t i = 0; i < counts.size(); ++i) weights[i] *= static_cast<double>(counts[i]);
  return weights;
}

/// States at these positions, in order: in memory already, or made again once each.
template <class X>
std::pair<std::shared_ptr<state_store<X> const>, std::vector<std::size_t>> gathered(
    std::shared_ptr<state_store<X> const> const& states, std::vector<std::size_t> const& positions) {
  if (states->data() != nullptr) return {states, positions};
  std::vector<std::size_t> distinct = positions;
  std::sort(distinct.begin(), distinct.end());
  distinct.erase(std::unique(distinct.begin(), distinct.end()), distinct.end());
  state_array<X> made;
  made.reserve(distinct.size());
  unlocated([&] { states->remake(distinct, [&](X&& state) { made.emplace_back(std::move(state)); }); });
  std::vector<std::size_t> places(positions.size());
  for (std::size_t s = 0; s < places.size(); ++s)
    places[s] = static_cast<std::size_t>(std::lower_bound(distinct.begin(), distinct.end(), positions[s]) - distinct.begin());
  return {std::make_shared<kept_states<X, state_array<X>> const>(std::move(made)), std::move(places)};
}

template <class X>
ensemble<X> resampled(weighted_sample<X> const& sample, count k, resample_options const& options) {
  if (k == 0u) throw bad_argument("resample: 0 states were asked for; at least one is allowed");
  std::size_t const n = static_cast<std::size_t>(k.value());
  std::vector<double> const weights = plain_weights(sample);
  draws source(options.seed, 0, purpose::resample);
  std::vector<std::size_t> positions = options.scheme == scheme::systematic
                                           ? systematic_positions(weights, n, source.uniform())
                                           : multinomial_positions(weights, n, source);
  if (options.shuffled) shuffle(positions, source);
  auto [states, places] = gathered(sample.store(), positions);
  return ensemble<X>(std::move(states), std::move(places), std::move(positions),
                     std::make_shared<weighted_sample<X> const>(sample), options.scheme);
}

}  // namespace steelyard::inline v1::detail
