// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/lanes.hpp>

namespace steelyard::inline v1::detail {

/// What a ladder of rungs sees of a state.
struct mark {
  double log_likelihood = impossible;  ///< `impossible` where zero, or where the run failed
  double margin = impossible;
};

/// The distribution that a rung's moves leave as it is, as a density over the
/// prior: likelihood^power where the state is possible and its margin high enough.
struct rung_target {
  double power = 0.0;
  bool possible_only = false;  ///< power 0, but states of likelihood zero are out
  double level = impossible;   ///< margin at least so high,
  bool above = false;          ///< or even higher

  /// Its logarithm; `impossible` where zero.
  [[nodiscard]] double log_density(mark const& m) const noexcept {
    if (m.margin < level || (above && !(m.margin > level))) return impossible;
    if (power == 0.0) return possible_only && !(m.log_likelihood > impossible) ? impossible : 0.0;
    return m.log_likelihood > impossible ? power * m.log_likelihood : impossible;
  }
};

/// How states would weigh on the next rung, as far as this one's starts can tell: what its chains have to forget.
struct outlook {
  double step = 0.0, top = 0.0;  ///< tempering: e^(step (ll - top))
  double level = impossible;     ///< levels: 1 where the margin is at least so high
  [[nodiscard]] double weight(mark const& m) const noexcept {
    if (level > impossible) return m.margin >= level ? 1.0 : 0.0;
    return m.log_likelihood > impossible ? portable_exp(std::min(0.0, step * (m.log_likelihood - top))) : 0.0;
  }
};

/// Log-likelihoods and margins of a population, with how many particles each stands for.
struct population_view {
  std::span<double const> log_likelihoods, margins, counts;
};

/// Share of the effective size that weights e^(step ll) leave to particles of
/// equal weight: (sum m w)^2 / (sum m * sum m w^2), in (0, 1].
///   [Zhou, Johansen & Aston, J. Comput. Graph. Stat. 25, 2016]
inline double step_share(population_view const& all, double step) noexcept {
  double top = impossible;
  for (double const l : all.log_likelihoods) top = std::max(top, l);
  if (!(top > impossible)) return 0.0;
  double sum = 0.0, squares = 0.0, whole = 0.0;
  for (std::size_t i = 0; i < all.counts.size(); ++i) {
    whole += all.counts[i];
    if (!(all.log_likelihoods[i] > impossible)) continue;
    double const w = portable_exp(step * (all.log_likelihoods[i] - top));
    sum += all.counts[i] * w;
    squares += all.counts[i] * w * w;
  }
  return sum * (sum / squares) / whole;
}

/// The longest step up to `most` that leaves at least `share` of the effective size, by bisection on its logarithm.
///   [Del Moral, Doucet & Jasra, J. R. Stat. Soc. B 68, 2006]
/// @pre some step does
inline double longest_step(population_view const& all, double most, double share) noexcept {
  if (step_share(all, most) >= share) return most;
  double high = most, low = most / 16.0;
  while (low > 0.0 && step_share(all, low) < share) {
    high = low;
    low /= 16.0;
  }
  for (int i = 0; i < 20; ++i) {
    double const middle = portable_sqrt(low) * portable_sqrt(high);
    (step_share(all, middle) >= share ? low : high) = middle;
  }
  return low;
}

/// Share of the particles that have any likelihood.
inline double possible_share(population_view const& all) noexcept {
  double some = 0.0, whole = 0.0;
  for (std::size_t i = 0; i < all.counts.size(); ++i) {
    whole += all.counts[i];
    if (all.log_likelihoods[i] > impossible) some += all.counts[i];
  }
  return some / whole;
}

}  // namespace steelyard::inline v1::detail
