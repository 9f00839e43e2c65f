// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/harder/climb.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1::detail {

template <class Margin, class State>
concept is_margin = callable_v<Margin, State const&> && std::is_convertible_v<result_t<Margin, State const&>, double> &&
                    !std::is_same_v<std::remove_cvref_t<result_t<Margin, State const&>>, bool>;

/// Levels are no more than this: with the usual share of a fifth, probabilities down to 1e-84.
inline constexpr std::size_t most_levels = 120;

/// The next level for particles in view, of which at least a share reaches it: zero itself, from above, where that many
/// do. Where ties hold the level down, the next value above them.
/// @returns false where no particle is above the present level
inline bool next_level(population_view const& all, double share, rung_target const& now, rung_target& next) {
  std::vector<std::pair<double, double>> margins;  // with counts, the highest first
  double whole = 0.0;
  for (std::size_t i = 0; i < all.counts.size(); ++i) {
    whole += all.counts[i];
    mark const seen{all.log_likelihoods[i], all.margins[i]};
    if (now.log_density(seen) > impossible && seen.margin > impossible) margins.emplace_back(seen.margin, all.counts[i]);
  }
  if (margins.empty()) return false;
  std::sort(margins.begin(), margins.end(), [](auto const& a, auto const& b) { return a.first > b.first; });
  double level = margins.back().first, sum = 0.0;
  for (auto const& [margin, count] : margins) {
    sum += count;
    if (sum < share * whole) continue;
    level = margin;
    break;
  }
  next = now;
  next.above = level > 0.0;
  next.level = next.above ? 0.0 : level;
  if (next.level > now.level || next.above) return true;
  next.level = now.level;  // ties at the present level hold more than the share
  next.above = true;
  return margins.front().first > now.level && !now.above;
}

/// Climbs from the prior, or from what a reading left of it, to where the margin is above zero, and keeps how.
template <class Worker>
class level_climb {
 public:
  level_climb(ladder<Worker>& on, rung_watch const& watch, bool reading) : on_(on), watch_(watch), reading_(reading) {}

  /// @param keep  whether the states above zero are to be kept
  void climb(bool keep) {
    if (reading_) ended_ = temper(on_, watch_, false, record_);
    readings_ = record_.size();
    note_start();
    while (!reached() && ended_ == nullptr && levels() < most_levels) {
      rung_target next;
      if (!next_level(on_.particles().view(), on_.terms().level_share, on_.target(), next)) return;
      if (!on_.climb(next, keep && arrives(next))) return;
      record_.push_back(on_.settings());
      ended_ = watch_.after_rung(on_.calls(), on_.failed());
    }
  }

  /// The same rungs again, by particles drawn anew.
  void repeat() {
    for (std::size_t r = 0; r < record_.size() && ended_ == nullptr; ++r) {
      if (r == readings_) note_start();
      bool const last = r + 1 == record_.size();
      if (!on_.follow(record_[r], last)) {
        fell_short_ = true;
        return;
      }
      ended_ = watch_.after_rung(on_.calls(), on_.failed());
    }
  }

  /// Whether all particles have a margin above zero.
  [[nodiscard]] bool reached() const noexcept { return !fell_short_ && arrives(on_.target()); }
  [[nodiscard]] std::size_t levels() const noexcept { return record_.size() - readings_; }
  [[nodiscard]] bool fell_short() const noexcept { return fell_short_; }
  [[nodiscard]] ladder<Worker>& on() const noexcept { return on_; }
  [[nodiscard]] char const* ended() const noexcept { return ended_; }
  /// Of the levels alone: the logarithm of the probability, influence of each lineage on it, square of the floor.
  [[nodiscard]] double log_probability() const noexcept { return on_.particles().log_evidence() - start_.log_evidence; }
  [[nodiscard]] double floor_square() const noexcept { return on_.particles().floor_square() - start_.floor_square; }
  [[nodiscard]] std::vector<double> influence() const {
    std::vector<double> all = on_.particles().influence();
    for (std::size_t e = 0; e < start_.influence.size(); ++e) all[e] -= start_.influence[e];
    return all;
  }

 private:
  struct start {
    double log_evidence = 0.0, floor_square = 0.0;
    std::vector<double> influence;
  };
  static bool arrives(rung_target const& target) noexcept { return target.above && target.level == 0.0; }

  void note_start() {
    auto const& now = on_.particles();
    start_ = {now.log_evidence(), now.floor_square(), now.influence()};
  }

  ladder<Worker>& on_;
  rung_watch const& watch_;
  bool reading_;
  std::vector<rung_settings> record_;
  std::size_t readings_ = 0;
  start start_;
  char const* ended_ = nullptr;
  bool fell_short_ = false;
};

}  // namespace steelyard::inline v1::detail
