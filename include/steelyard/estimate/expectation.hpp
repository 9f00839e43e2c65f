// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <span>
#include <utility>

#include <steelyard/estimate/estimates.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/mean_sums.hpp>

namespace steelyard::inline v1 {

/// Weighted mean of a readout: mu = sum W f, se^2 = c sum_g u_g^2.
///   [Owen, Monte Carlo theory, methods and examples, 2013, ch. 9]
/// Answers `estimate`, or `estimates<N>` where the readout returns N numbers.
/// Assumes finite readouts whose fourth power is in range (|f| between 1e-77 and 1e77).
template <class Readout, std::size_t Columns = 1>
class expectation_estimator {
 public:
  static constexpr bool own_error = true;

  explicit expectation_estimator(Readout its_readout) : readout_(std::move(its_readout)) {}

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }
  [[nodiscard]] expectation_estimator fresh() const { return expectation_estimator(readout_); }

  template <class State>
  [[nodiscard]] auto for_state() const {
    constexpr std::size_t n = readout_columns<detail::result_t<Readout, State const&>>::size;
    return expectation_estimator<Readout, n>(readout_);
  }

  void add(std::span<double const>, std::span<double const>, weighted_view const& view) { sums_.add(view); }
  void rescale(double factor) { sums_.rescale(factor); }
  expectation_estimator& operator+=(expectation_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] auto answer(run_facts const& facts) const {
    if constexpr (Columns == 1) {
      return estimate(sums_.mean()[0], sums_.terms(0, facts), facts);
    } else {
      std::array<estimate, Columns> each;
      std::array<double, Columns * Columns> covariance{};
      for (std::size_t k = 0; k < Columns; ++k) {
        each[k] = estimate(sums_.mean()[k], sums_.terms(k, facts), facts);
        for (std::size_t j = 0; j < Columns; ++j)
          covariance[k * Columns + j] = facts.correction() * sums_.product(k, j, facts);
      }
      return estimates<Columns>(each, covariance);
    }
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::mean_sums<Columns>::fields(self.sums_);
  }

 private:
  Readout readout_;
  detail::mean_sums<Columns> sums_;
};

/// Expectation of a readout under the weighted sample.
template <class Readout>
[[nodiscard]] auto expectation(Readout readout) {
  return expectation_estimator<Readout>(std::move(readout));
}

}  // namespace steelyard::inline v1
