// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/lanes.hpp>

namespace steelyard::inline v1::detail {

/// What a ladder of rungs sees of a state.
struct mark {
  double log_likelihood = impossible;  ///< `impossible` where zero
  double margin = 0.0;
};

/// The distribution that a rung's moves leave as it is, as a density over the
/// prior: likelihood^power where the state is possible and margin >= level.
struct rung_target {
  double power = 0.0;
  double level = impossible;
  bool possible_only = false;  ///< power 0, but states of likelihood zero are out

  /// Its logarithm; `impossible` where zero.
  [[nodiscard]] double log_density(mark const& m) const noexcept {
    if (m.margin < level) return impossible;
    if (power == 0.0) return possible_only && !(m.log_likelihood > impossible) ? impossible : 0.0;
    return m.log_likelihood > impossible ? power * m.log_likelihood : impossible;
  }
};

/// Share of the effective size that weights e^(step * ll) leave to particles of
/// equal weight: (sum m w)^2 / (sum m * sum m w^2), in (0, 1].
///   [Zhou, Johansen & Aston, J. Comput. Graph. Stat. 25, 2016]
inline double step_share(std::span<double const> log_likelihoods, std::span<double const> counts, double step) noexcept {
  double top = impossible;
  for (double const l : log_likelihoods) top = std::max(top, l);
  if (!(top > impossible)) return 0.0;
  double sum = 0.0, squares = 0.0, all = 0.0;
  for (std::size_t i = 0; i < log_likelihoods.size(); ++i) {
    all += counts[i];
    if (!(log_likelihoods[i] > impossible)) continue;
    double const w = portable_exp(step * (log_likelihoods[i] - top));
    sum += counts[i] * w;
    squares += counts[i] * w * w;
  }
  return sum * (sum / squares) / all;
}

/// The longest step up to `most` that leaves at least `share` of the effective size, by bisection on its logarithm.
inline double longest_step(std::span<double const> log_likelihoods, std::span<double const> counts, double most,
                           double share) noexcept {
  if (step_share(log_likelihoods, counts, most) >= share) return most;
  double high = most, low = most / 16.0;
  while (low > 0.0 && step_share(log_likelihoods, counts, low) < share) {
    high = low;
    low /= 16.0;
  }
  for (int i = 0; i < 30; ++i) {
    double const middle = portable_sqrt(low) * portable_sqrt(high);
    (step_share(log_likelihoods, counts, middle) >= share ? low : high) = middle;
  }
  return low;
}

}  // namespace steelyard::inline v1::detail
