// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/inversion.hpp>
#include <steelyard/harder/normal_fit.hpp>

namespace steelyard::inline v1::detail {

/// How a move proposes new words; all but `fitted` leave independent uniform words as they are.
enum class move_kind : std::uint8_t {
  shift,           ///< each chosen word moves round the circle by a uniform step
  autoregressive,  ///< z' = sqrt(1 - s^2) z + s e in normal deviates   [Cotter, Roberts, Stuart & White 2013]
  fresh,           ///< chosen words anew
  fitted,          ///< autoregressive about a mean and covariance fitted to the other half of the lineages
};

/// One way to propose: a kind, how wide, and which share of the words at once.
struct arm {
  move_kind kind = move_kind::fresh;
  double scale = 1.0;     ///< s above, or the width of a shift as a share of the circle
  double included = 1.0;  ///< chance that a word is among those moved
  double share = 0.0;     ///< how often this arm is chosen
};

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

/// A chain's place: the words its state used, their normal deviates, and what became of them.
struct chain_place {
  std::vector<std::uint64_t> words;
  std::vector<double> deviates;

  void find_deviates(std::size_t from = 0) {
    deviates.resize(words.size());
    for (std::size_t i = from; i < words.size(); ++i) deviates[i] = normal_from_word(words[i]);
  }
};

/// A proposal under way: the words to play, which of them changed, and the density ratio of a fitted move.
struct proposal {
  std::vector<std::uint64_t> words;
  std::vector<double> deviates;      ///< of the words changed, in their order
  std::vector<std::uint32_t> changed;
  double log_ratio = 0.0;
  std::vector<double> scratch;
};

/// Which words take part, each with the same chance and without regard to how many the state used; one at least
/// among the first `reach`.
inline void choose_words(double included, std::size_t reach, std::size_t size, draws& source, std::vector<std::uint32_t>& chosen) {
  chosen.clear();
  if (included >= 1.0) {
    for (std::size_t i = 0; i < size; ++i) chosen.push_back(static_cast<std::uint32_t>(i));
    return;
  }
  std::size_t const sure = static_cast<std::size_t>(source.index(reach));
  double const rate = -1.0 / portable_log1p(-included);
  for (double at = 0.0;;) {  // gaps between chosen words are geometric
    double const gap = -portable_log(source.uniform()) * rate;
    at += static_cast<double>(static_cast<std::uint64_t>(gap < 1e15 ? gap : 1e15));
    std::size_t const i = at < 1e15 ? static_cast<std::size_t>(at) : size;
    if (sure < i && sure < size && (chosen.empty() || chosen.back() < sure)) chosen.push_back(static_cast<std::uint32_t>(sure));
    if (i >= size) return;
    if (chosen.empty() || chosen.back() != i) chosen.push_back(static_cast<std::uint32_t>(i));
    at += 1.0;
  }
}

/// Proposes from `at` by one arm. The deviates of `at` are known.
/// @param reach  words that a state uses as a rule
/// @param fit    for the fitted arm; it moves the first fit.size() words, and `at` has at least so many
inline void propose(arm const& by, chain_place const& at, std::size_t reach, normal_fit const& fit, draws& source, proposal& to) {
  to.words = at.words;
  to.deviates.clear();
  to.log_ratio = 0.0;
  double const keep = portable_sqrt(std::max(0.0, 1.0 - by.scale * by.scale));
  if (by.kind == move_kind::fitted) {
    std::size_t const k = fit.size();
    to.changed.resize(k);
    to.deviates.resize(k);
    to.scratch.resize(k);
    std::span<double> const e(to.scratch), z(to.deviates);
    double ratio = 0.5 * fit.standardise(std::span<double const>(at.deviates).first(k), e);
    for (std::size_t i = 0; i < k; ++i) ratio -= 0.5 * at.deviates[i] * at.deviates[i];
    double after = 0.0;
    for (std::size_t i = 0; i < k; ++i) {
      e[i] = keep * e[i] + by.scale * source.normal();
      after += e[i] * e[i];
    }
    fit.place(e, z);
    double outside = 0.0;
    for (std::size_t i = 0; i < k; ++i) {
      outside += z[i] * z[i];
      to.changed[i] = static_cast<std::uint32_t>(i);
      to.words[i] = word_from_normal(z[i]);
    }
    // prior density ratio over the ratio of the fitted one: [phi(z')/phi(z)] / [g(z')/g(z)]
    to.log_ratio = -0.5 * outside + 0.5 * after - ratio;
    return;
  }
  choose_words(by.included, reach, at.words.size(), source, to.changed);
  switch (by.kind) {
    case move_kind::autoregressive:
      to.deviates.reserve(to.changed.size());
      for (std::uint32_t const i : to.changed) {
        to.deviates.push_back(keep * at.deviates[i] + by.scale * source.normal());
        to.words[i] = word_from_normal(to.deviates.back());
      }
      break;
    case move_kind::shift:
      for (std::uint32_t const i : to.changed) {
        double const way = by.scale * (source.uniform() - 0.5);
        to.words[i] += static_cast<std::uint64_t>(static_cast<std::int64_t>(way * 0x1p63)) * 2u;
      }
      break;
    default:
      for (std::uint32_t const i : to.changed) to.words[i] = source();
      break;
  }
}

}  // namespace steelyard::inline v1::detail
