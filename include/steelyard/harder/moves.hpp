// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/inversion.hpp>
#include <steelyard/harder/mixture_fit.hpp>
#include <steelyard/harder/normal_fit.hpp>

namespace steelyard::inline v1::detail {

/// How a move proposes new words. All but `fitted`, `mixture` and `exact` leave independent uniform words as they are, so that
/// the likelihood alone decides.
enum class move_kind : std::uint8_t {
  shift,           ///< each chosen word goes a uniform step round the circle
  autoregressive,  ///< z' = sqrt(1 - s^2) z + s e in normal deviates   [Cotter, Roberts, Stuart & White 2013]
  fresh,           ///< chosen words anew
  fitted,          ///< autoregressive about a normal law fitted to the other half of the lineages
  mixture,         ///< anew from a mixture of normal laws fitted likewise, where few words have several modes
  exact,           ///< a user's exact draw of one block
};

/// One way to propose: a kind, how wide, and which words.
struct arm {
  move_kind kind = move_kind::fresh;
  double scale = 1.0;             ///< s above, or the width of a shift as a share of the circle
  double included = 1.0;          ///< chance that a word is among those moved
  std::size_t first = 0, last = 0;  ///< instead: the block of words [first, last)
  std::size_t own = 0;            ///< which of the user's moves
  double trend = 1.0;             ///< scale at the end of a rung over that at the end of the rung before
};

/// A chain's place: the words its state used, and what is known of them.
struct chain_place {
  std::vector<std::uint64_t> words;
  std::size_t used = 0;           ///< by the state: words past them are free, and tell nothing of its class
  std::vector<double> deviates;   ///< normal deviates of the words
  std::vector<double> standard;   ///< the same standardised by a fit,
  double standard_squares = 0.0;  ///< the sum of their squares,
  bool standard_known = false;    ///< and whether the two hold

  void find_deviates() {
    used = words.size();
    deviates.resize(words.size());
    for (std::size_t i = 0; i < words.size(); ++i) deviates[i] = normal_from_word(words[i]);
    standard_known = false;
  }
};

/// A proposal under way: words to play, which of them changed, and the density ratio of a fitted move.
struct proposal {
  std::vector<std::uint64_t> words;
  std::vector<std::uint32_t> changed;
  std::vector<double> deviates;  ///< of the words changed, in their order; empty where not known
  std::vector<double> standard;  ///< of a fitted move
  double standard_squares = 0.0;
  double log_ratio = 0.0;
};

/// Which words take part, without regard to how many the state used: each with the same chance, and one among the
/// first `reach` for sure.
inline void choose_words(arm const& by, std::size_t reach, std::size_t size, draws& source, std::vector<std::uint32_t>& chosen) {
  chosen.clear();
  std::size_t first = 0, last = size;
  if (by.last > 0) {
    first = by.first;
    last = std::min(by.last, size);
  }
  if (by.included >= 1.0 || by.last > 0) {
    for (std::size_t i = first; i < last; ++i) chosen.push_back(static_cast<std::uint32_t>(i));
    return;
  }
  auto const sure = static_cast<std::size_t>(source.index(reach));
  double const rate = -1.0 / portable_log1p(-by.included);
  bool given = sure >= size;
  for (double at = 0.0;; at += 1.0) {  // gaps between chosen words are geometric
    double const gap = -portable_log(source.uniform()) * rate;
    at += static_cast<double>(static_cast<std::uint64_t>(std::min(gap, 1e15)));
    std::size_t const i = at < static_cast<double>(size) ? static_cast<std::size_t>(at) : size;
    if (!given && sure <= i) {
      given = true;
      if (sure < i) chosen.push_back(static_cast<std::uint32_t>(sure));
    }
    if (i >= size) return;
    chosen.push_back(static_cast<std::uint32_t>(i));
  }
}

/// Proposes by the fitted move from `at`, whose deviates are known: it moves the first fit.size() words.
///   log ratio = log phi(z')/phi(z) - log g(z')/g(z), phi the prior's density and g the fitted one
inline void propose_fitted(double scale, chain_place& at, normal_fit const& fit, draws& source, proposal& to) {
  std::size_t const k = fit.size();
  to.words = at.words;
  to.changed.resize(k);
  to.deviates.resize(k);
  to.standard.resize(k);
  if (!at.standard_known) {
    at.standard.resize(k);
    at.standard_squares = fit.standardise(std::span<double const>(at.deviates).first(k), at.standard);
    at.standard_known = true;
  }
  double const keep = portable_sqrt(std::max(0.0, 1.0 - scale * scale));
  double squares = 0.0;
  for (std::size_t i = 0; i < k; ++i) {
    to.standard[i] = keep * at.standard[i] + scale * source.normal();
    squares += to.standard[i] * to.standard[i];
  }
  fit.place(to.standard, to.deviates);
  double outside = 0.0;
  for (std::size_t i = 0; i < k; ++i) {
    outside += at.deviates[i] * at.deviates[i] - to.deviates[i] * to.deviates[i];
    to.changed[i] = static_cast<std::uint32_t>(i);
    to.words[i] = word_from_normal(to.deviates[i]);
  }
  to.standard_squares = squares;
  to.log_ratio = 0.5 * (outside + squares - at.standard_squares);
}

/// Proposes anew from a fitted mixture: the first mix.size() words.
///   log ratio as above, with g the mixture                              [an independence chain: Tierney, Ann. Stat. 22, 1994]
inline void propose_mixture(chain_place const& at, mixture_fit const& mix, draws& source, proposal& to) {
  std::size_t const k = mix.size();
  to.words = at.words;
  to.changed.resize(k);
  to.deviates.resize(k);
  mix.draw(source, to.deviates);
  double outside = 0.0;
  for (std::size_t i = 0; i < k; ++i) {
    outside += at.deviates[i] * at.deviates[i] - to.deviates[i] * to.deviates[i];
    to.changed[i] = static_cast<std::uint32_t>(i);
    to.words[i] = word_from_normal(to.deviates[i]);
  }
  to.log_ratio = 0.5 * outside + mix.log_density(std::span<double const>(at.deviates).first(k)) - mix.log_density(to.deviates);
}

/// Proposes by one of the other arms from `at`, whose deviates are known.
/// @param reach  words that states use as a rule
inline void propose(arm const& by, chain_place const& at, std::size_t reach, draws& source, proposal& to) {
  to.words = at.words;
  to.deviates.clear();
  to.log_ratio = 0.0;
  choose_words(by, reach, at.words.size(), source, to.changed);
  double const keep = portable_sqrt(std::max(0.0, 1.0 - by.scale * by.scale));
  for (std::uint32_t const i : to.changed) {
    if (by.kind == move_kind::autoregressive) {
      to.deviates.push_back(keep * at.deviates[i] + by.scale * source.normal());
      to.words[i] = word_from_normal(to.deviates.back());
    } else if (by.kind == move_kind::shift) {
      double const way = by.scale * (source.uniform() - 0.5);
      to.words[i] += static_cast<std::uint64_t>(static_cast<std::int64_t>(way * 0x1p63)) * 2u;
    } else {
      to.words[i] = source();
    }
  }
}

}  // namespace steelyard::inline v1::detail
