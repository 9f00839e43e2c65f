// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <type_traits>
#include <utility>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/inversion.hpp>

namespace steelyard::inline v1 {

/// A block of the words that a sampler consumes, counted from 0, to be proposed together: all of them anew, or all
/// of them a little. The likelihood decides.
///   run_tempered(pipe, plan, sy::refresh_together{2, 3})     words 2, 3 and 4
struct refresh_together {
  count first = 0;
  count size = 1;
};

/// The words of one block, as an exact draw reads and writes them.
class block_words {
 public:
  explicit block_words(std::span<std::uint64_t> words) noexcept : words_(words) {}

  [[nodiscard]] std::size_t size() const noexcept { return words_.size(); }
  /// What `draws::uniform()` and `draws::normal()` make of word j as it stands.
  [[nodiscard]] double uniform(std::size_t j) const { return detail::uniform_from_word(words_[j]); }
  [[nodiscard]] double normal(std::size_t j) const { return detail::normal_from_word(words_[j]); }

  /// Makes word j one from which `draws::uniform()` returns u, for 0 < u < 1, to 2^-53.
  void set_uniform(std::size_t j, double u) {
    if (!detail::is_finite(u) || !(u > 0.0 && u < 1.0)) throw bad_argument("block_words: the uniform number " + detail::plain_number(u) + " is outside (0, 1)");
    words_[j] = static_cast<std::uint64_t>(u * 0x1p52) << 12;
  }
  /// Makes word j one from which `draws::normal()` returns z.
  void set_normal(std::size_t j, double z) {
    if (!detail::is_finite(z)) throw bad_argument("block_words: the normal deviate " + detail::plain_number(z) + " is not finite");
    words_[j] = detail::word_from_normal(z);
  }
  void set_word(std::size_t j, std::uint64_t word) { words_[j] = word; }

 private:
  std::span<std::uint64_t> words_;
};

/// The Gibbs step for a block of words: `draw(state, power, draws&, block_words&)` writes words drawn from their
/// exact distribution given everything else, under the prior times likelihood^power. It is always accepted.
///   A draw that is not exact makes answers wrong, and nothing can notice.
/// @pre every state uses these words
template <class Draw>
struct exact_draw {
  count first;
  count size;
  Draw draw;

  exact_draw(count its_first, count its_size, Draw its_draw) : first(its_first), size(its_size), draw(std::move(its_draw)) {}
};

namespace detail {

template <class T>
inline constexpr bool is_exact_draw = false;
template <class Draw>
inline constexpr bool is_exact_draw<exact_draw<Draw>> = true;
template <class T>
inline constexpr bool is_own_move = std::is_same_v<T, refresh_together> || is_exact_draw<T>;

/// Where a user's move acts.
struct word_block {
  std::size_t first = 0, size = 0;
  bool exact = false;
};
template <class Move>
word_block block_of(Move const& move) {
  if (move.size == 0u) throw bad_argument("run_tempered: a block of 0 words cannot be moved; its size must be at least 1");
  return {static_cast<std::size_t>(move.first.value()), static_cast<std::size_t>(move.size.value()), is_exact_draw<Move>};
}

}  // namespace detail

}  // namespace steelyard::inline v1
