// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <type_traits>
#include <utility>

#include <steelyard/base/functional.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/draw/philox.hpp>

namespace steelyard::inline v1 {
namespace detail {

/// Two words of a stream spread over as many 32-bit seed words as an engine
/// asks for: a seed sequence in the standard's sense. 128 bits go in, so that
/// engines of different samples do not meet as they would from one 32-bit seed.
class seed_words {
 public:
  using result_type = std::uint_least32_t;

  seed_words(std::uint64_t first, std::uint64_t second) noexcept : first_(first), second_(second) {}
  seed_words(seed_words const&) = delete;
  seed_words& operator=(seed_words const&) = delete;

  template <class Iterator>
  void generate(Iterator begin, Iterator end) const {
    philox_block block{};
    for (std::uint64_t k = 0; begin != end; ++begin, ++k) {
      if (k % 8 == 0) block = philox({k / 8, 0, 0, 0}, first_, second_);
      std::uint64_t const word = block[k % 8 / 2] >> (k % 2 * 32);
      *begin = static_cast<std::uint_least32_t>(word & 0xffffffffu);
    }
  }

  [[nodiscard]] static constexpr std::size_t size() noexcept { return 4; }

  template <class Iterator>
  void param(Iterator out) const {
    for (std::uint64_t const word : {first_, second_}) {
      *out++ = static_cast<std::uint_least32_t>(word & 0xffffffffu);
      *out++ = static_cast<std::uint_least32_t>(word >> 32);
    }
  }

 private:
  std::uint64_t first_;
  std::uint64_t second_;
};

/// A sampler around `f(Engine&)`.
template <class Engine, class Function>
struct engine_sampler {
  Function f;

  decltype(auto) operator()(draws& source) const {
    std::uint64_t const first = source();
    std::uint64_t const second = source();
    seed_words seeds(first, second);
    Engine engine(seeds);
    return detail::call(f, engine);
  }
};

/// A sampler around `f(std::uint64_t seed)`.
template <class Function>
struct seed_sampler {
  Function f;

  decltype(auto) operator()(draws& source) const { return detail::call(f, source()); }
};

}  // namespace detail

/// Makes a sampler of a generator written for a standard engine: each sample
/// calls f(engine) with an engine of its own, seeded through a seed sequence
/// from two words of the sample's stream.
///   `with_engine<std::mt19937_64>(f)`
/// Assumes  f keeps nothing between calls, a distribution object least of all.
///          Such a sampler has no local moves: tempered runs cannot improve it.
template <class Engine, class Function>
[[nodiscard]] auto with_engine(Function f) {
  constexpr bool seeded = std::is_constructible_v<Engine, detail::seed_words&>;
  constexpr bool called = std::is_invocable_v<Function const&, Engine&>;
  static_assert(seeded, "with_engine<Engine>(f): the engine must be constructible from a seed sequence; "
                        "use with_seed(f) for one that takes a number");
  static_assert(called, "with_engine<Engine>(f): f must be callable as f(engine) with Engine&, and as const");
  if constexpr (seeded && called) return detail::engine_sampler<Engine, Function>{std::move(f)};
}

/// Makes a sampler of a generator that takes a 64-bit seed: f(seed), one word
/// of the sample's stream each.
/// Assumes  f uses all 64 bits: of 32-bit seeds two in 65 536 samples are likely
///          to be equal. Such a sampler has no local moves (see `with_engine`).
template <class Function>
[[nodiscard]] auto with_seed(Function f) {
  constexpr bool called = std::is_invocable_v<Function const&, std::uint64_t>;
  static_assert(called, "with_seed(f): f must be callable as f(seed) with a std::uint64_t, and as const");
  if constexpr (called) return detail::seed_sampler<Function>{std::move(f)};
}

}  // namespace steelyard::inline v1
