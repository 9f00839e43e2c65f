// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <span>
#include <tuple>

#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/estimator.hpp>

namespace steelyard::inline v1 {

/// The diagnosis of the weights as an answer beside others, in one pass or on a kept sample.
class health_estimator {
 public:
  static constexpr bool own_error = true;

  [[nodiscard]] std::tuple<> readout() const noexcept { return {}; }
  [[nodiscard]] health_estimator fresh() const { return {}; }
  void add(std::span<double const>, std::span<double const>, weighted_view const&) {}
  void rescale(double) {}
  health_estimator& operator+=(health_estimator const&) { return *this; }
  /// What every run adds up for its diagnosis anyway.
  [[nodiscard]] diagnosis answer(run_facts const& facts) const { return facts.health ? *facts.health : diagnosis(); }
  template <class Self>
  static std::tuple<> fields(Self&) {
    return {};
  }
};

/// Whether the weights can carry questions: effective size, perplexity, largest share, tail index, findings.
[[nodiscard]] inline health_estimator health() { return {}; }

}  // namespace steelyard::inline v1
