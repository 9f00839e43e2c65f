// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <tuple>

#include <steelyard/base/elementary.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/ratio_sums.hpp>

namespace steelyard::inline v1 {

/// Logarithm of the evidence, the mean likelihood under the base weights:
///   log Z = base + log(sum e^(b+l) / sum e^b),   u_g = sum over g of B_i (e^l_i / Z - 1)
///   independent and unweighted: se^2 = sum (w/wbar - 1)^2 / (n (n-1))
/// Failed runs count as drawn. A likelihood without its constants may not be
/// compared between models.
class log_evidence_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr bool takes_zero_weights = true;

  [[nodiscard]] std::tuple<> readout() const noexcept { return {}; }
  [[nodiscard]] log_evidence_estimator fresh() const { return {}; }

  void add(std::span<double const>, std::span<double const> weights, weighted_view const& view) {
    sums_.add(
        weights.size(), [&](std::size_t i) { return view.count(i); }, [&](std::size_t i) { return weights[i]; },
        [&](std::size_t i) { return view.base_weights.empty() ? 1.0 : view.base_weights[i]; }, !view.groups.empty(),
        [&](std::size_t i) { return view.groups[i]; });
  }
  void rescale(double factor) { sums_.rescale(factor, 1.0); }
  log_evidence_estimator& operator+=(log_evidence_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] estimate answer(run_facts const& facts) const {
    detail::ratio_sums all = sums_;
    if (facts.failed > 0)
      all.add(
          1, [&](std::size_t) { return static_cast<double>(facts.failed); }, [](std::size_t) { return 0.0; },
          [](std::size_t) { return 1.0; }, false, [](std::size_t) { return std::uint32_t{0}; });
    double const value = facts.base + (facts.maximum - facts.base_maximum) +
                         (detail::portable_log(all.top()) - detail::portable_log(all.bottom()));
    return estimate(value, all.terms(all.top(), facts.groups > 0.0), facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::ratio_sums::fields(self.sums_);
  }

 private:
  detail::ratio_sums sums_;
};

/// Logarithm of the evidence.
[[nodiscard]] inline log_evidence_estimator log_evidence() { return {}; }

}  // namespace steelyard::inline v1
