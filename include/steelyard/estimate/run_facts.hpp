// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <limits>
#include <memory>
#include <span>
#include <vector>

#include <steelyard/estimate/verdict.hpp>

namespace steelyard::inline v1 {

/// What the log-evidence accounted for before owes to each lineage: the error
/// it carries, term by term, so that an increment adds to the same units.
struct base_influence {
  std::vector<double> of_group;  ///< by rank of the lineages that live
  double rest_squares = 0.0;     ///< sum of squares over those that died out
  double rest_fourth = 0.0;      ///< sum of fourth powers over them
  double rest_largest = 0.0;     ///< their largest square
};

class diagnosis;

/// What an estimator may know of the run when it answers.
struct run_facts {
  std::uint64_t drawn = 0;   ///< samples, failed runs and counts included
  std::uint64_t zeros = 0;   ///< states of weight zero
  std::uint64_t failed = 0;  ///< runs that gave no state; 0 once an event is given, since they are in none
  double maximum = 0.0;      ///< the running maximum: weights are relative to its exponential
  double sum = 0.0;          ///< of those weights
  double sum_squares = 0.0;  ///< of those weights; with counts, each copy on its own
  double base_maximum = 0.0; ///< base weights are relative to its exponential
  double base = 0.0;         ///< log-evidence already accounted for, after tempering
  steelyard::how_drawn how = steelyard::how_drawn::independent;
  double groups = 0.0;                ///< independent groups; 0: every sample on its own
  double group_share_squares = 0.0;   ///< sum m_g^2 over the groups' shares of the samples
  double largest_unit = 0.0;          ///< largest normalised weight of one sample or group
  bool bound_known = false;           ///< the weighter declared a bound
  double log_bound = 0.0;             ///< that bound
  bool far_from_drawn = false;        ///< weights far from those that the states were moved under
  std::shared_ptr<base_influence const> influence = {};  ///< of `base`, by lineage; null: none
  std::shared_ptr<diagnosis const> health = {};               ///< of the weights; null while a run goes on

  /// Kish's effective size; 0 where no weight is positive.
  [[nodiscard]] double effective_size() const noexcept {
    return sum_squares > 0.0 ? sum * (sum / sum_squares) : 0.0;
  }
  /// 1 / sum m_g^2: how many lineages of equal size carry as much.
  [[nodiscard]] double effective_groups() const noexcept {
    return group_share_squares > 0.0 ? 1.0 / group_share_squares : 0.0;
  }
  /// Factor c of se^2 = c sum u_g^2: n/(n-1), R/(R-1), or 1/(1 - sum m_g^2).
  [[nodiscard]] double correction() const noexcept {
    if (groups > 0.0 && how == steelyard::how_drawn::replicated) return groups > 1.0 ? groups / (groups - 1.0) : 0.0;
    if (groups > 0.0) return group_share_squares < 1.0 ? 1.0 / (1.0 - group_share_squares) : 0.0;
    double const n = static_cast<double>(drawn);
    return n > 1.0 ? n / (n - 1.0) : 0.0;
  }
};

/// What an estimator with its own error is handed beside values and weights.
/// Empty spans: all counts are one, no groups, base weights all equal.
struct weighted_view {
  std::span<double const> values;
  std::span<double const> weights;
  std::span<std::uint64_t const> counts;
  std::span<std::uint32_t const> groups;
  std::span<double const> base_weights;  ///< e^b relative to base_maximum; only where zero weights are handed on
  steelyard::how_drawn how = steelyard::how_drawn::independent;

  [[nodiscard]] double count(std::size_t i) const noexcept {
    return counts.empty() ? 1.0 : static_cast<double>(counts[i]);
  }
};

}  // namespace steelyard::inline v1
