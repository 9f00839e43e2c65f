// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/estimate/weight_totals.hpp>

namespace steelyard::inline v1::detail {

/// Samples in a block; rounds, checkpoints and ranks end on whole blocks.
inline constexpr std::size_t block_size = 1024;
/// Groups of the jackknife when samples are independent: (sample / 16) mod 64.
inline constexpr std::size_t jackknife_groups = 64;
inline constexpr std::size_t jackknife_run = 16;

/// Up to 1024 weighed states as estimators see them: log-weights of all, and
/// the readout columns of those of positive weight, packed in front.
class block {
 public:
  /// @param columns  readout columns of all estimators together
  explicit block(std::size_t columns, std::size_t capacity = block_size)
      : capacity_(capacity), columns_(columns), log_weights_(capacity), values_(columns * capacity), weights_(capacity),
        kept_weights_(capacity), positions_(capacity), samples_(capacity) {}

  /// @param first       number of the block's first sample
  /// @param first_copy  the same with every state as often as it counts
  void clear(std::uint64_t first, std::uint64_t first_copy = 0) {
    first_ = first;
    first_copy_ = first_copy;
    counts_.clear();
    groups_.clear();
    base_.clear();
    size_ = kept_ = 0;
  }

  /// Takes in one state. Where it returns true, the state's readouts go to `row()` next.
  /// @pre fewer than the capacity were pushed
  bool push(std::uint64_t sample, double log_weight) noexcept {
    std::size_t const at = size_++, kept = kept_;
    bool const possible = log_weight > impossible;
    kept_ = kept + (possible ? 1 : 0);
    log_weights_[at] = log_weight;
    positions_[kept] = static_cast<std::uint32_t>(at);
    samples_[kept] = sample;
    return possible;
  }
  void push_count(std::uint64_t m) { counts_.push_back(m); }
  void push_group(std::uint32_t label) { groups_.push_back(label); }
  /// Room for the base weights of all states, to be filled by the caller.
  [[nodiscard]] std::span<double> base(std::size_t n) {
    base_.resize(n);
    return base_;
  }

  /// First column of the last state pushed; columns lie `stride()` apart.
  [[nodiscard]] double* row() noexcept { return values_.data() + (kept_ - 1); }
  [[nodiscard]] double* first_row() noexcept { return values_.data(); }
  [[nodiscard]] std::size_t stride() const noexcept { return capacity_; }

  /// Turns log-weights to weights and packs the columns. @pre every push is done
  /// @param with_largest  whether the totals are to know the largest log-weights
  void close(how_drawn how, bool with_largest = true) {
    how_ = how;
    std::span<double const> const logs = std::span<double const>(log_weights_).first(size_);
    totals_ = weight_totals::of(logs, counts_, std::span<double>(weights_.data(), size_), size_ - kept_);
    totals_.add_groups(groups_, counts_, weights_);
    if (with_largest) totals_.largest = seen_.take(logs, counts_, totals_.maximum);
    if (kept_ == size_)
      std::copy_n(weights_.begin(), kept_, kept_weights_.begin());
    else
      for (std::size_t j = 0; j < kept_; ++j) kept_weights_[j] = weights_[positions_[j]];
    pick(counts_, kept_counts_);
    pick(groups_, kept_groups_);
    number_copies();
    for (std::size_t c = 1; c < columns_ && kept_ < capacity_; ++c)
      std::copy_n(values_.data() + c * capacity_, kept_, values_.data() + c * kept_);
  }

  [[nodiscard]] weight_totals const& totals() const noexcept { return totals_; }
  [[nodiscard]] std::size_t kept() const noexcept { return kept_; }
  [[nodiscard]] std::span<std::uint64_t const> samples() const noexcept { return {samples_.data(), kept_}; }
  [[nodiscard]] std::uint64_t first() const noexcept { return first_; }
  /// Number of the first copy of kept state j, were every state drawn as often as it counts. @pre there are counts
  [[nodiscard]] std::uint64_t first_copy(std::size_t j) const noexcept { return kept_copies_[j]; }

  /// `columns` columns from `column` on, with the weights of the states of positive weight.
  [[nodiscard]] weighted_view view(std::size_t column, std::size_t columns) const noexcept {
    weighted_view v;
    v.values = std::span<double const>(values_).subspan(column * kept_, columns * kept_);
    v.weights = std::span<double const>(kept_weights_).first(kept_);
    v.counts = kept_counts_;
    v.groups = kept_groups_;
    v.how = how_;
    return v;
  }
  /// Every state, those of weight zero too; no values.
  [[nodiscard]] weighted_view all() const noexcept {
    weighted_view v;
    v.weights = std::span<double const>(weights_).first(size_);
    v.counts = counts_;
    v.groups = groups_;
    v.base_weights = base_;
    v.how = how_;
    return v;
  }

  /// @throws bad_readout where a readout is not finite at a state of positive weight.
  void refuse_not_finite(std::size_t column, std::size_t columns) const {
    std::span<double const> const values = view(column, columns).values;
    if (all_finite(values)) return;
    for (std::size_t k = 0; k < values.size(); ++k)
      if (!is_finite(values[k]))
        throw bad_readout("estimate: a readout of sample " + std::to_string(samples_[k % kept_]) + " is " +
                          plain_number(values[k]) + "; it must be a finite number where the weight is positive");
  }

 private:
  template <class T>
  void pick(std::vector<T> const& from, std::vector<T>& to) const {
    to.clear();
    if (!from.empty())
      for (std::size_t j = 0; j < kept_; ++j) to.push_back(from[positions_[j]]);
  }

  void number_copies() {
    kept_copies_.clear();
    std::uint64_t next = first_copy_;
    for (std::size_t i = 0, j = 0; i < counts_.size() && j < kept_; next += counts_[i++])
      if (positions_[j] == i) {
        kept_copies_.push_back(next);
        ++j;
      }
  }

  std::size_t capacity_;
  std::size_t kept_ = 0;  // states of positive weight; not beside size_, or compilers move both through one slow register
  std::size_t columns_;
  std::uint64_t first_ = 0;
  std::uint64_t first_copy_ = 0;
  std::size_t size_ = 0;  // states pushed
  how_drawn how_ = how_drawn::independent;
  std::vector<double> log_weights_, values_, weights_, kept_weights_, base_;
  std::vector<std::uint32_t> positions_;
  std::vector<std::uint64_t> samples_, counts_, kept_counts_, kept_copies_;
  std::vector<std::uint32_t> groups_, kept_groups_;
  weight_totals totals_;
  top_weights seen_;  // in all blocks that were closed here
};

}  // namespace steelyard::inline v1::detail
