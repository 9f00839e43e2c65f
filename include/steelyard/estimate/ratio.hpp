// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <tuple>
#include <utility>

#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/ratio_sums.hpp>

namespace steelyard::inline v1 {

/// Ratio of two expectations on one sample, E f / E g: their errors are
/// correlated, and the error bar knows it.
///   u = W (f - r g) / E g                                   [delta method; Owen 2013, ch. 2]
/// Assumes an E g that can be told from zero; see the verdict of `expectation(g)`.
template <class Top, class Bottom>
class ratio_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 2;

  ratio_estimator(Top top, Bottom bottom) : readouts_(std::move(top), std::move(bottom)) {}

  [[nodiscard]] std::tuple<Top, Bottom> const& readout() const noexcept { return readouts_; }
  [[nodiscard]] ratio_estimator fresh() const { return {std::get<0>(readouts_), std::get<1>(readouts_)}; }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    std::size_t const n = weights.size();
    sums_.add(
        n, [&](std::size_t i) { return view.count(i); }, [&](std::size_t i) { return weights[i] * values[i]; },
        [&](std::size_t i) { return weights[i] * values[n + i]; }, !view.groups.empty(),
        [&](std::size_t i) { return view.groups[i]; });
  }
  void rescale(double factor) { sums_.rescale(factor, factor); }
  ratio_estimator& operator+=(ratio_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  /// @throws bad_readout where E g is exactly zero.
  estimate answer(run_facts const& facts) const {
    if (sums_.bottom() == 0.0) throw bad_readout("ratio: the expectation below the line is exactly zero");
    return estimate(sums_.ratio(), sums_.terms(sums_.bottom(), facts.groups > 0.0), facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::ratio_sums::fields(self.sums_);
  }

 private:
  std::tuple<Top, Bottom> readouts_;
  detail::ratio_sums sums_;
};

/// Ratio of the expectations of two scalar readouts.
template <class Top, class Bottom>
[[nodiscard]] auto ratio(Top top, Bottom bottom) {
  return ratio_estimator<Top, Bottom>(std::move(top), std::move(bottom));
}

}  // namespace steelyard::inline v1
