// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/harder/moves.hpp>
#include <steelyard/harder/rung.hpp>
#include <steelyard/sample/state_store.hpp>
#include <steelyard/sample/systematic.hpp>

namespace steelyard::inline v1::detail {

/// A state that a chain stayed at for some steps.
struct visit {
  mark seen;
  std::uint64_t steps = 0;
  std::size_t first_word = 0;  ///< in the trail's words
  std::size_t words = 0;
};

/// Where a chain has been on one rung. A state is kept once, with how long the chain stayed.
template <class X>
struct trail {
  std::uint32_t lineage = 0;
  std::vector<visit> visits;
  std::vector<std::uint64_t> words;
  std::vector<double> scores;   ///< a row for each visit, on the last rung
  state_array<X> states;        ///< one for each visit, on the last rung, where states are kept
  std::optional<X> state;       ///< the present one, where an exact draw looks at it
  chain_place at;
  mark here;

  [[nodiscard]] std::span<std::uint64_t const> words_of(visit const& v) const noexcept {
    return std::span<std::uint64_t const>(words).subspan(v.first_word, v.words);
  }
  /// Begins a stay where the chain is now, of one step so far.
  void arrive() {
    visits.push_back({here, 1, words.size(), at.words.size()});
    words.insert(words.end(), at.words.begin(), at.words.end());
  }
  void stay() noexcept { ++visits.back().steps; }
};

/// All particles of a rung, chain by chain, and what climbing so far came to.
///   logZ    sum over rungs of log mean w
///   D_e     influence of lineage e on it: sum over rungs of sum over e of (w / mean w - 1) / N
///                                        [Chan & Lai, Ann. Stat. 41, 2013; Lee & Whiteley, Biometrika 105, 2018]
template <class X>
class population {
 public:
  std::vector<trail<X>> trails;

  [[nodiscard]] double log_evidence() const noexcept { return log_evidence_; }
  [[nodiscard]] std::vector<double> const& influence() const noexcept { return influence_; }
  /// Square of the coefficient of variation that uncorrelated particles would have left on levels: sum (1 - p)/(p N).
  ///                                                                [Au & Beck, Prob. Eng. Mech. 16, 2001]
  [[nodiscard]] double floor_square() const noexcept { return floor_square_; }
  [[nodiscard]] population_view view() const noexcept { return {log_likelihoods_, margins_, counts_}; }
  [[nodiscard]] std::span<double const> weights() const noexcept { return weights_; }

  /// Reads the trails anew; the first time, each is a lineage.
  void read() {
    log_likelihoods_.clear();
    margins_.clear();
    counts_.clear();
    for (auto const& t : trails)
      for (visit const& v : t.visits) {
        log_likelihoods_.push_back(v.seen.log_likelihood);
        margins_.push_back(v.seen.margin);
        counts_.push_back(static_cast<double>(v.steps));
      }
    if (influence_.empty()) influence_.assign(trails.size(), 0.0);
  }

  /// Weighs the particles by one target over another and takes the step into the evidence.
  /// @returns false, and takes nothing, where every weight is zero
  bool weigh(rung_target const& from, rung_target const& to) {
    weights_.assign(counts_.size(), 0.0);
    double top = impossible, all = 0.0, sum = 0.0;
    for (std::size_t p = 0; p < weights_.size(); ++p) {
      mark const seen{log_likelihoods_[p], margins_[p]};
      double const after = to.log_density(seen);
      weights_[p] = after > impossible ? after - from.log_density(seen) : impossible;
      top = std::max(top, weights_[p]);
      all += counts_[p];
    }
    if (!(top > impossible)) return false;
    for (std::size_t p = 0; p < weights_.size(); ++p)
      sum += weights_[p] = weights_[p] > impossible ? counts_[p] * portable_exp(weights_[p] - top) : 0.0;
    log_evidence_ += top + portable_log(sum / all);
    floor_square_ += (all - sum) / (sum * all);
    std::size_t p = 0;
    for (auto const& t : trails)
      for (std::size_t v = 0; v < t.visits.size(); ++v, ++p) influence_[t.lineage] += weights_[p] / sum - counts_[p] / all;
    return true;
  }

  /// The starts of n chains: systematic, in the particles' order, in proportion to their weights.
  [[nodiscard]] std::vector<trail<X>> starts(std::size_t n, double u) const {
    std::vector<std::size_t> const positions = systematic_positions(weights_, n, u);
    std::vector<trail<X>> chosen(n);
    std::size_t p = 0, s = 0;
    for (auto const& t : trails)
      for (visit const& v : t.visits) {
        for (; s < n && positions[s] == p; ++s) {
          chosen[s].lineage = t.lineage;
          auto const words = t.words_of(v);
          chosen[s].at.words.assign(words.begin(), words.end());
          chosen[s].here = v.seen;
        }
        ++p;
      }
    return chosen;
  }

  /// Calls act(trail, visit, weight) for the particles of positive weight in one half of the lineages.
  template <class Act>
  void each_of_half(std::size_t half, Act act) const {
    std::size_t p = 0;
    for (auto const& t : trails)
      for (visit const& v : t.visits) {
        double const w = weights_[p++];
        if ((t.lineage & 1u) == half && w > 0.0) act(t, v, w);
      }
  }

 private:
  std::vector<double> log_likelihoods_, margins_, counts_, weights_, influence_;
  double log_evidence_ = 0.0, floor_square_ = 0.0;
};

}  // namespace steelyard::inline v1::detail
