// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/elementary.hpp>
#include <steelyard/base/normal.hpp>

namespace steelyard::inline v1::detail {

/// Middle of the word's cell on (0, 1), 52 bits: never 0 or 1.
inline double uniform_from_word(std::uint64_t word) noexcept {
  return times(plus(static_cast<double>(static_cast<std::int64_t>(word >> 12)), 0.5), 0x1p-52);
}

/// Which tail a whole word falls in and how much probability lies beyond it:
/// the lower tail for words below 2^63, else the upper one, so that both ends
/// keep 64 bits. 2^-65 <= probability <= 1/2.
struct tail {
  bool lower;
  double probability;
};

inline tail tail_from_word(std::uint64_t word) noexcept {
  bool const lower = word < sign_bit;
  auto const beyond = static_cast<std::int64_t>(lower ? word : ~word);
  return {lower, times(plus(static_cast<double>(beyond), 0.5), 0x1p-64)};
}

/// Standard normal deviate, rising with the word; ~word gives its mirror image.
/// The middle is inverted from the word's distance to 2^63, so that deviates
/// near zero keep their digits too.
inline double normal_from_word(std::uint64_t word) noexcept {
  bool const lower = word < sign_bit;
  auto const distance = static_cast<std::int64_t>((lower ? ~word : word) ^ sign_bit);
  double const q = times(plus(static_cast<double>(distance), 0.5), 0x1p-64);
  double const z = q <= 0.425 ? normal_middle_quantile(q) : -normal_far_quantile(tail_from_word(word).probability);
  return lower ? -z : z;
}

/// The word whose cell holds the standard normal deviate z, to within 2^-53 of
/// the tail: the inverse of `normal_from_word`, clamped to its range.
inline std::uint64_t word_from_normal(double z) noexcept {
  double const p = times(normal_tail(z < 0.0 ? -z : z), 0x1p64);  // at most 2^63
  std::uint64_t const cell = p < 0x1p63 ? static_cast<std::uint64_t>(p) : sign_bit - 1;
  return z < 0.0 ? cell : ~cell;
}

/// Exponential deviate of rate 1, rising with the word.
inline double exponential_from_word(std::uint64_t word) noexcept {
  tail const t = tail_from_word(word);
  return t.lower ? -portable_log1p(-t.probability) : -portable_log(t.probability);
}

}  // namespace steelyard::inline v1::detail
