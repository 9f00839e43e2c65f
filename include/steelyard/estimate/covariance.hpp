// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/error.hpp>
#include <steelyard/estimate/correlation.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/moment_sums.hpp>

namespace steelyard::inline v1 {

/// Covariance matrix of a readout of N numbers, each entry with its own error,
/// and the correlations; symmetric.
template <std::size_t N>
class covariance_result {
 public:
  covariance_result(std::vector<estimate> covariances, std::vector<correlation_result> correlations)
      : covariances_(std::move(covariances)), correlations_(std::move(correlations)) {}

  [[nodiscard]] static constexpr std::size_t size() noexcept { return N; }
  /// Covariance of entries i and j, in the product of their units. @throws bad_argument past the end.
  estimate const& operator()(std::size_t i, std::size_t j) const { return covariances_[place(i, j)]; }
  /// Correlation of entries i and j. @throws bad_argument past the end.
  correlation_result const& correlation(std::size_t i, std::size_t j) const { return correlations_[place(i, j)]; }

 private:
  static std::size_t place(std::size_t i, std::size_t j) {
    if (i >= N || j >= N)
      throw bad_argument("covariance: there is no entry (" + std::to_string(i) + ", " + std::to_string(j) +
                         ") in a matrix of " + std::to_string(N) + " rows");
    return i >= j ? i * (i + 1) / 2 + j : j * (j + 1) / 2 + i;
  }
  std::vector<estimate> covariances_;
  std::vector<correlation_result> correlations_;
};

/// Covariance matrix of a readout of N numbers:
///   c_ij = sum W (f_i-mu_i)(f_j-mu_j) n/(n-1), n Kish's effective size;  u = W ((f_i-mu_i)(f_j-mu_j) - c_ij)
/// Cost  33 N (N+1) multiplications a sample, and as many numbers of memory a part of the run.
template <class Readout, std::size_t Columns = 1>
class covariance_estimator {
 public:
  static constexpr bool own_error = true;

  explicit covariance_estimator(Readout its_readout) : readout_(std::move(its_readout)) {}

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }
  [[nodiscard]] covariance_estimator fresh() const { return covariance_estimator(readout_); }

  template <class State>
  [[nodiscard]] auto for_state() const {
    return covariance_estimator<Readout, readout_columns<detail::result_t<Readout, State const&>>::size>(readout_);
  }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    sums_.add(view, [&](std::size_t k) {
      std::size_t i = 0;
      while ((i + 1) * (i + 2) / 2 <= k) ++i;
      std::size_t const j = k - i * (i + 1) / 2;
      return std::array{values.data() + i * weights.size(), values.data() + j * weights.size()};
    });
  }
  void rescale(double factor) { sums_.rescale(factor); }
  covariance_estimator& operator+=(covariance_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] covariance_result<Columns> answer(run_facts const& facts) const {
    double const size = facts.effective_size(), factor = size > 1.0 ? size / (size - 1.0) : 0.0;
    auto const all = sums_.centred();
    std::vector<estimate> covariances;
    std::vector<correlation_result> correlations;
    for (std::size_t k = 0; k < pairs; ++k) {
      double const unit = all.scale(0, k) * all.scale(1, k) * factor, c = all.moment(1, 1, k);
      typename sums_t::polynomial q{};
      q[all.place(1, 1)] = unit;
      q[0] = -unit * c;
      covariances.push_back(estimate(unit * c, all.terms(q, facts, k), facts));
      correlations.push_back(detail::correlation_of(all, facts, k));
    }
    return covariance_result<Columns>(std::move(covariances), std::move(correlations));
  }

  template <class Self>
  static auto fields(Self& self) {
    return sums_t::fields(self.sums_);
  }

 private:
  static constexpr std::size_t pairs = Columns * (Columns + 1) / 2;
  using sums_t = detail::moment_sums<2, 2, pairs>;

  Readout readout_;
  sums_t sums_;
};

/// Covariance matrix of a readout that returns a fixed array of numbers, or a variance where it returns one.
template <class Readout>
[[nodiscard]] auto covariance(Readout readout) {
  return covariance_estimator<Readout>(std::move(readout));
}

}  // namespace steelyard::inline v1
