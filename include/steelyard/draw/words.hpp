// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <cstdint>
#include <memory>
#include <string>
#include <utility>

#include <steelyard/draw/word_source.hpp>

namespace steelyard::inline v1 {

/// Choice of where a run's random words come from, as a field of a plan:
/// independent Philox streams unless given a source. Cheap to copy.
class words {
 public:
  words() noexcept = default;

  /// Words from `source`, shared with every copy; null means independent streams.
  words(std::shared_ptr<word_source const> source) noexcept  // NOLINT: implicit on purpose
      : source_(std::move(source)) {}

  template <class Source>
    requires std::derived_from<Source, word_source>
  words(std::shared_ptr<Source> source) noexcept : source_(std::move(source)) {}  // NOLINT: implicit on purpose

  [[nodiscard]] bool independent() const noexcept { return source_ == nullptr; }

  /// Number of independent randomisations; 0 when the samples themselves are independent.
  [[nodiscard]] std::uint64_t replicates() const { return source_ ? source_->replicates() : 0; }

  /// The randomisation that sample `i` belongs to; 0 when independent.
  [[nodiscard]] std::uint64_t replicate_of(std::uint64_t i) const { return source_ ? source_->replicate_of(i) : 0; }

  /// Whether a run may have `size` samples.
  [[nodiscard]] bool allows(std::uint64_t size) const { return source_ == nullptr || source_->allows(size); }

  /// The sizes it allows, in words.
  [[nodiscard]] std::string sizes() const { return source_ ? source_->sizes() : std::string("any size"); }

  /// The source itself, null when independent.
  [[nodiscard]] word_source const* source() const noexcept { return source_.get(); }

 private:
  std::shared_ptr<word_source const> source_;
};

}  // namespace steelyard::inline v1
