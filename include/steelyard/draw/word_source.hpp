// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <span>
#include <string>

namespace steelyard::inline v1 {

/// Where the words of a run come from when not from independent streams:
/// the base class of low-discrepancy and other sources. One object serves all
/// threads, so `fill` is const and must not change anything.
class word_source {
 public:
  word_source() = default;
  word_source(word_source const&) = default;
  word_source& operator=(word_source const&) = default;
  virtual ~word_source() = default;

  /// Writes words first_word, first_word + 1, ... of sample `sample`. The same
  /// (seed, sample, position) must give the same word whatever the calls
  /// before; `seed` is the plan's, so that another seed randomises afresh.
  virtual void fill(std::uint64_t seed, std::uint64_t sample, std::uint64_t first_word,
                    std::span<std::uint64_t> out) const = 0;

  /// Number of independent randomisations among the samples; 0 when the
  /// samples themselves are independent.
  [[nodiscard]] virtual std::uint64_t replicates() const { return 0; }

  /// The randomisation that sample `sample` belongs to, below `replicates()`.
  [[nodiscard]] virtual std::uint64_t replicate_of(std::uint64_t /*sample*/) const { return 0; }

  /// Whether a run of `size` samples is a whole number of balanced sets.
  [[nodiscard]] virtual bool allows(std::uint64_t /*size*/) const { return true; }

  /// The rule behind `allows`, to end a sentence: "any size", "8 times a power of two".
  [[nodiscard]] virtual std::string sizes() const { return "any size"; }
};

}  // namespace steelyard::inline v1
