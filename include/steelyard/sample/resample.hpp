// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/ensemble.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

namespace detail {

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
  drawn_slots slots = draw_slots(options.scheme, weights, n, source);
  if (options.shuffled) shuffle(slots, source);
  auto [states, places] = gathered(sample.store(), slots.positions);
  return ensemble<X>(std::move(states), std::move(places), std::move(slots),
                     std::make_shared<weighted_sample<X> const>(sample), options.scheme);
}

}  // namespace detail

template <class X>
weighted_sample<X> ensemble<X>::as_sample() const {
  std::vector<std::size_t> order(size());
  for (std::size_t s = 0; s < size(); ++s) order[s] = s;
  std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return places_[a] < places_[b]; });
  auto origin = parent_ ? std::make_shared<detail::sample_origin>(*parent_->origin()) : std::make_shared<detail::sample_origin>();
  std::vector<std::uint32_t> const groups = std::move(origin->groups);
  std::vector<std::uint64_t> const counts = std::move(origin->counts);
  std::vector<std::size_t> distinct;
  std::vector<std::uint64_t> samples, units;
  detail::sample_columns columns;
  origin->groups.clear();
  origin->counts.clear();
  origin->copies_before.clear();
  origin->findings.clear();
  origin->failed = 0;
  for (std::size_t from = 0, to = 0; from < order.size(); from = to) {
    std::size_t const slot = order[from], index = indices_[slot];
    while (to < order.size() && places_[order[to]] == places_[slot]) ++to;
    double const copies = static_cast<double>(to - from);
    units.push_back(1);  // copies of a state that stood for several samples: of how many of them, at a guess
    if (slot_weights_.empty() && !counts.empty())
      units.back() = static_cast<std::uint64_t>(copies / (1.0 + (copies - 1.0) / static_cast<double>(counts[index])));
    distinct.push_back(places_[slot]);
    samples.push_back(parent_ ? origin->sample_of(index) : index);
    columns.base.push_back(
        detail::portable_log(slot_weights_.empty() ? copies / static_cast<double>(units.back()) : slot_weights_[slot]));
    if (!groups.empty()) origin->groups.push_back(groups[index]);
  }
  origin->drawn = units.size();
  if (counts.empty())
    origin->samples = std::move(samples);
  else
    origin->take_counts(std::move(units));
  columns.log_weights = columns.base;
  columns.base_maximum = *std::max_element(columns.base.begin(), columns.base.end());
  auto states = states_;
  if (parent_ && states_ == parent_->store())
    states = std::make_shared<detail::chosen_states<X> const>(states_, std::move(distinct));
  return weighted_sample<X>(std::move(states), std::move(columns), std::move(origin), "as_sample");
}

}  // namespace steelyard::inline v1
