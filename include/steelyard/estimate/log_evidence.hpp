// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <vector>

#include <steelyard/base/elementary.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/ratio_sums.hpp>

namespace steelyard::inline v1 {

/// Logarithm of the evidence, the mean likelihood under the base weights:
///   log Z = base + log(sum e^(b+l) / sum e^b),   u_g = sum over g of B_i (e^l_i / Z - 1)
///   independent and unweighted: se^2 = sum (w/wbar - 1)^2 / (n (n-1))
///   after tempering: log Z so far + log mean e^(b+l), u_e = D_e + sum over e of (e^(b+l) / mean - 1) / N,
///   D_e what log Z so far owes to lineage e                     [Chan & Lai 2013; Lee & Whiteley 2018]
/// Failed runs count as drawn. A likelihood without its constants may not be
/// compared between models.
class log_evidence_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr bool takes_zero_weights = true;

  [[nodiscard]] std::tuple<> readout() const noexcept { return {}; }
  [[nodiscard]] log_evidence_estimator fresh() const { return {}; }

  void add(std::span<double const>, std::span<double const> weights, weighted_view const& view) {
    if (view.counts.empty() && view.groups.empty() && view.base_weights.empty()) return sums_.add_even(weights);
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
    error_terms const terms = facts.influence                                ? with_base(all, *facts.influence)
                              : facts.groups > 0.0 && facts.failed > 0 ? of_replicates(all, facts.groups)
                                                                       : all.terms(all.top(), facts.groups > 0.0);
    return estimate(value, terms, facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::ratio_sums::fields(self.sums_);
  }

 private:
  /// Terms of the increment and of what was accounted for before, unit by unit.
  static error_terms with_base(detail::ratio_sums const& all, base_influence const& before) {
    std::vector<double> u = before.of_group;
    all.each_group(all.top(), [&](std::uint32_t label, double increment) {
      if (label < u.size()) u[label] += increment;
    });
    error_terms terms{before.rest_squares, before.rest_fourth, before.rest_largest};
    for (double const each : u) {
      double const square = each * each;
      terms.sum_squares += square;
      terms.sum_fourth += square * square;
      if (square > terms.largest_square) terms.largest_square = square;
    }
    return terms;
  }

  /// Terms from replicates of one size, whose failed runs are no entries: u_g is a replicate's share of the likelihood
  /// less its share of the samples.
  static error_terms of_replicates(detail::ratio_sums const& all, double groups) {
    error_terms terms;
    auto const take = [&](double u) {
      terms.sum_squares += u * u;
      terms.sum_fourth += (u * u) * (u * u);
      if (u * u > terms.largest_square) terms.largest_square = u * u;
    };
    double missing = groups;
    all.each_top([&](double top) {
      take(top / all.top() - 1.0 / groups);
      missing -= 1.0;
    });
    for (; missing > 0.5; missing -= 1.0) take(-1.0 / groups);
    return terms;
  }

  detail::ratio_sums sums_;
};

/// Logarithm of the evidence.
[[nodiscard]] inline log_evidence_estimator log_evidence() { return {}; }

}  // namespace steelyard::inline v1
