// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <memory>
#include <utility>

#include <steelyard/base/error.hpp>
#include <steelyard/sample/alias_table.hpp>
#include <steelyard/sample/resample.hpp>
#include <steelyard/sample/weighted_sample.hpp>

namespace steelyard::inline v1 {

/// Picks states of a weighted sample one at a time, independently and in
/// proportion to their weights: `picker pick{sample}; X const& x = pick(draws);`
/// A cheap handle on a shared table, called as const from any thread. It is a sampler too, of copies: the next run can
/// draw from what this reading left. The errors of that run then leave out the error of this sample.
template <class X>
class picker {
 public:
  using value_type = X;

  /// Cost  one walk over the states, 16 bytes for each.
  explicit picker(weighted_sample<X> sample)
      : sample_(std::move(sample)),
        table_(std::make_shared<detail::alias_table const>(detail::plain_weights(sample_))) {}

  /// Position of the next state. One word.
  std::size_t index(draws& source) const { return table_->draw(source); }

  /// The next state, which lives as long as the sample's states. One word.
  /// @throws not_kept where the sample kept its streams only: use index() and with_state().
  X const& operator()(draws& source) const {
    X const* const states = sample_.store()->data();
    if (states == nullptr)
      throw not_kept(
          "picker: this sample kept its streams only; use sample.with_state(pick.index(draws), f), or run with "
          "keeping::states");
    return states[index(source)];
  }

  [[nodiscard]] weighted_sample<X> const& sample() const noexcept { return sample_; }

 private:
  weighted_sample<X> sample_;
  std::shared_ptr<detail::alias_table const> table_;
};

}  // namespace steelyard::inline v1
