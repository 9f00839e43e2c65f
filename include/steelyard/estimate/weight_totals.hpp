// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/estimate/top_weights.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

/// Sums over the weights alone, relative to a running maximum.
struct weight_totals {
  double maximum = impossible;  ///< largest log-weight so far
  double sum = 0.0;             ///< sum m w
  double squares = 0.0;         ///< sum m w^2
  double logs = 0.0;            ///< sum m w (log w), log w relative to the maximum
  double samples = 0.0;         ///< sum m, zeros included
  double zeros = 0.0;           ///< sum m where w = 0
  double states = 0.0;          ///< entries, whatever their counts
  top_weights largest;          ///< log-weights
  group_sums<1> groups;         ///< sum m w of each group, where there are groups

  /// Fills `weights` with exp(log_weight - maximum), 0 where impossible.
  /// @param none  how many are impossible
  static weight_totals of(std::span<double const> log_weights, std::span<std::uint64_t const> counts,
                          std::span<double> weights, std::size_t none) {
    weight_totals s;
    s.states = s.samples = static_cast<double>(log_weights.size());
    s.maximum = block_maximum(log_weights);
    s.zeros = static_cast<double>(none);
    auto const sums = weights_from_logs(log_weights, s.maximum, weights);
    s.sum = sums.sum;
    s.squares = sums.sum_squares;
    s.logs = sums.sum_logs;
    if (counts.empty()) return s;
    s.samples = s.zeros = s.sum = s.squares = s.logs = 0.0;
    for (std::size_t i = 0; i < counts.size(); ++i) {
      double const m = static_cast<double>(counts[i]), w = weights[i];
      bool const possible = log_weights[i] > impossible;
      s.samples += m;
      s.zeros += possible ? 0.0 : m;
      s.sum += m * w;
      s.squares += m * w * w;
      s.logs += possible ? m * w * (log_weights[i] - s.maximum) : 0.0;
    }
    return s;
  }

  void rescale(double factor, double by_log) {
    logs = factor * (logs + by_log * sum);
    sum *= factor;
    squares *= factor * factor;
    groups.for_each([&](auto& of_one) { of_one[0] *= factor; });
  }
  /// Both sides already relative to one maximum.
  void join(weight_totals const& other) {
    sum += other.sum;
    squares += other.squares;
    logs += other.logs;
    samples += other.samples;
    zeros += other.zeros;
    states += other.states;
    largest += other.largest;
    groups += other.groups;
  }

  /// Adds each weight to its group. @pre one group a weight
  void add_groups(std::span<std::uint32_t const> labels, std::span<std::uint64_t const> counts,
                  std::span<double const> weights) {
    for (std::size_t i = 0; i < labels.size(); ++i)
      groups.push(labels[i], {(counts.empty() ? 1.0 : static_cast<double>(counts[i])) * weights[i]});
    groups.settle();
  }
  /// Largest normalised weight of one group.
  [[nodiscard]] double largest_group() const noexcept {
    double most = 0.0, all = 0.0;
    for (std::size_t g = 0; g < groups.size(); ++g) {
      most = std::max(most, groups[g][0]);
      all += groups[g][0];
    }
    return all > 0.0 ? most / all : 0.0;
  }

  [[nodiscard]] double effective_size() const noexcept { return squares > 0.0 ? sum * (sum / squares) : 0.0; }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.maximum, self.sum, self.squares, self.logs, self.samples, self.zeros, self.states,
                                   top_weights::fields(self.largest)),
                          group_sums<1>::fields(self.groups));
  }
};

}  // namespace steelyard::inline v1::detail
