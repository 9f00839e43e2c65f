// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/harder/moves.hpp>
#include <steelyard/harder/own_moves.hpp>
#include <steelyard/harder/rung.hpp>

namespace steelyard::inline v1::detail {

/// What an arm did: proposals, the sum of their acceptance, and the squared way they went.
struct arm_tally {
  double tries = 0.0, accepted = 0.0, way = 0.0;
  arm_tally& operator+=(arm_tally const& other) noexcept {
    tries += other.tries;
    accepted += other.accepted;
    way += other.way;
    return *this;
  }
};

/// How often an arm is chosen among states of one class, and why.
struct arm_use {
  double share = 0.0;
  double worth = 0.0;  ///< squared way of a call, as known so far
  arm_tally sofar{};   ///< on this rung
};

/// States that used the same number of words, or all that no other class holds. Fits and shares are for each class
/// its own: a fitted move goes only where it could come back from.
struct word_class {
  std::size_t words = 0;      ///< 0: the rest
  normal_fit fits[2];         ///< fits[h] for chains whose lineage has parity h, made from the others
  mixture_fit mixtures[2];    ///< likewise, where several modes fit better than one
  double scale = 1.0;         ///< of the fitted move
  std::vector<arm_use> uses;  ///< of each arm

  [[nodiscard]] bool offers(move_kind kind) const noexcept {
    if (kind == move_kind::fitted) return fits[0].size() > 0 && fits[1].size() > 0;
    return kind != move_kind::mixture || (mixtures[0].size() > 0 && mixtures[1].size() > 0);
  }
};

/// How the chains of one rung move: what a frozen run repeats.
struct rung_settings {
  rung_target target;
  std::vector<arm> arms;
  std::vector<word_class> classes;  ///< the last one is the rest
  std::size_t reach = 1;            ///< words that states use as a rule
  std::uint64_t length = 0;         ///< states of a chain
  outlook ahead;
  double way_unit = 1.0;            ///< twice the variance of the weight ahead

  [[nodiscard]] std::size_t class_of(std::size_t words) const noexcept {
    std::size_t c = 0;
    while (c + 1 < classes.size() && classes[c].words != words) ++c;
    return c;
  }
};

/// The arms of a first rung: every kind at every share of the words from all down to one, and the user's own.
inline std::vector<arm> first_arms(std::size_t reach, bool fitted, std::span<word_block const> own) {
  std::vector<arm> arms;
  if (fitted) {
    arms.push_back({move_kind::fitted});
    arms.push_back({move_kind::mixture});
  }
  for (double included = 1.0;; included = std::max(included / 4.0, 1.0 / static_cast<double>(reach))) {
    arms.push_back({move_kind::shift, 0.3, included});
    arms.push_back({move_kind::autoregressive, 0.5, included});
    arms.push_back({move_kind::fresh, 1.0, included});
    if (included * static_cast<double>(reach) <= 1.0) break;
  }
  for (std::size_t m = 0; m < own.size(); ++m) {
    std::size_t const first = own[m].first, last = first + own[m].size;
    if (own[m].exact) {
      arms.push_back({move_kind::exact, 1.0, 1.0, first, last, m});
    } else {
      arms.push_back({move_kind::fresh, 1.0, 1.0, first, last, m});
      arms.push_back({move_kind::autoregressive, 0.5, 1.0, first, last, m});
    }
  }
  return arms;
}

/// Gives each class the shares and scales of the rung before. A fitted arm that has no share yet begins with as much as
/// all those before it.
inline void inherit_uses(rung_settings& how, rung_settings const& before) {
  std::size_t const n = how.arms.size();
  auto const by_fit = [&](std::size_t a) { return how.arms[a].kind == move_kind::fitted || how.arms[a].kind == move_kind::mixture; };
  for (word_class& cls : how.classes) {
    if (before.classes.empty()) {
      cls.uses.assign(n, {1.0});
      for (std::size_t a = 0; a < n; ++a)
        if (by_fit(a)) cls.uses[a].share = 0.0;
    } else {
      word_class const& old = before.classes[before.class_of(cls.words)];
      cls.uses = old.uses;
      cls.scale = old.scale;
      for (arm_use& each : cls.uses) each.sofar = {};
    }
    double sum = 0.0;
    for (std::size_t a = 0; a < n; ++a) {
      if (!cls.offers(how.arms[a].kind)) cls.uses[a].share = 0.0;
      sum += cls.uses[a].share;
    }
    for (std::size_t a = 0; a < n; ++a)
      if (by_fit(a) && cls.offers(how.arms[a].kind) && cls.uses[a].share == 0.0) sum += cls.uses[a].share = sum;
    for (arm_use& each : cls.uses) each.share /= sum;
  }
}

/// Adapts to what the arms did since the last time, a row of arms for each class: scales towards an acceptance of
/// 0.45, shares in proportion to the fourth power of the squared way a call goes. A tenth is shared by all.
inline void adapt(rung_settings& how, std::span<arm_tally const> seen) {
  std::size_t const n = how.arms.size();
  auto const towards = [](double& scale, arm_tally const& t) {
    double const acceptance = (t.accepted + 0.45 * 5.0) / (t.tries + 5.0);
    scale = std::clamp(scale * portable_exp(2.5 * (acceptance - 0.45)), 1e-18, 1.0);
  };
  for (std::size_t a = 0; a < n; ++a) {
    arm_tally all;
    for (std::size_t c = 0; c < how.classes.size(); ++c) {
      all += seen[c * n + a];
      if (how.arms[a].kind == move_kind::fitted) towards(how.classes[c].scale, seen[c * n + a]);
    }
    if (how.arms[a].kind == move_kind::shift || how.arms[a].kind == move_kind::autoregressive) towards(how.arms[a].scale, all);
  }
  for (std::size_t c = 0; c < how.classes.size(); ++c) {
    std::vector<arm_use>& uses = how.classes[c].uses;
    double sum = 0.0, largest = 0.0;
    for (std::size_t a = 0; a < n; ++a) {
      uses[a].sofar += seen[c * n + a];
      uses[a].worth = (uses[a].sofar.way + 5.0 * uses[a].worth) / (uses[a].sofar.tries + 5.0);
      if (uses[a].share > 0.0) largest = std::max(largest, uses[a].worth);
    }
    if (!(largest > 0.0)) continue;
    auto const merit = [&](arm_use const& use) {
      double const square = (use.worth / largest) * (use.worth / largest);
      return use.share > 0.0 ? square * square : 0.0;
    };
    for (arm_use const& use : uses) sum += merit(use);
    double whole = 0.0;
    for (arm_use& use : uses) {
      if (use.share > 0.0) use.share = 0.1 / static_cast<double>(n) + 0.9 * merit(use) / sum;
      whole += use.share;
    }
    for (arm_use& use : uses) use.share /= whole;
  }
}

}  // namespace steelyard::inline v1::detail
