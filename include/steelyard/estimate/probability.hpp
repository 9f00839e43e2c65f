// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <tuple>
#include <utility>

#include <steelyard/base/moment_lanes.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// Probability of an event: share of the weight where it holds.
///   se^2 = c sum_g u_g^2, u = W (1_event - p); error intervals on the logit scale.
/// Never seen is not "certainly not": the value is 0, the verdict `broken`, and
/// the error interval ends at 1 - (1 - level)^(largest W); mirrored for always seen.
template <class Event>
class probability_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 1;
  static constexpr bool asks_an_event = true;

  explicit probability_estimator(Event event) : event_(std::move(event)) {}

  [[nodiscard]] Event const& readout() const noexcept { return event_; }
  [[nodiscard]] probability_estimator fresh() const { return probability_estimator(event_); }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    if (view.counts.empty()) {
      double sums[6];
      detail::sum_block<detail::block_sums::parted>(values, weights, 0.0, 0.0, 0.0, sums);
      in_ += detail::cell_sums{sums[0], sums[1], sums[2]};
      out_ += detail::cell_sums{sums[3], sums[4], sums[5]};
    } else {
      for (std::size_t i = 0; i < weights.size(); ++i) (values[i] != 0.0 ? in_ : out_).add(view.count(i), weights[i]);
    }
    if (view.groups.empty()) return;
    detail::grouped_cells block;
    for (std::size_t i = 0; i < weights.size(); ++i)
      block.add(view.groups[i], values[i] != 0.0 ? 1u : 0u, view.count(i) * weights[i]);
    groups_ += block;
  }
  void rescale(double factor) {
    in_.rescale(factor);
    out_.rescale(factor);
    groups_.rescale(factor);
  }
  probability_estimator& operator+=(probability_estimator const& other) {
    in_ += other.in_;
    out_ += other.out_;
    groups_ += other.groups_;
    return *this;
  }

  [[nodiscard]] estimate answer(run_facts const& facts) const {
    error_terms const terms = facts.groups > 0.0 ? groups_.terms([](std::uint32_t cell) { return cell == 1u; },
                                                                 [](std::uint32_t) { return true; })
                                                 : detail::share_terms(in_, out_);
    return detail::share_estimate(in_.weight, out_.weight, terms, in_.weight > 0.0, out_.weight > 0.0, facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.in_.weight, self.in_.second, self.in_.fourth,
                                   self.out_.weight, self.out_.second, self.out_.fourth),
                          detail::grouped_cells::fields(self.groups_));
  }

 private:
  Event event_;
  detail::cell_sums in_, out_;
  detail::grouped_cells groups_;
};

/// Probability of an event (a readout that returns `bool`).
template <class Event>
[[nodiscard]] auto probability(Event event) {
  return probability_estimator<Event>(std::move(event));
}

}  // namespace steelyard::inline v1
