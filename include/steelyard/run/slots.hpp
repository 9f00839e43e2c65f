// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/accumulation.hpp>
#include <steelyard/estimate/block.hpp>

namespace steelyard::inline v1::detail {

/// What one-pass resampling ends with: a stream number and a normalised weight for each slot.
struct slots_result {
  std::vector<std::uint64_t> samples;
  std::vector<double> weights;
};

/// Multinomial resampling in one pass: k slots, each with one sample of the part
/// seen so far. When parts A and B meet, a slot keeps B's with probability
/// S_B/(S_A + S_B), from the stream of A's first block and level.
///   by induction each slot holds sample i with probability w_i / sum w    [reservoir of weighted parts; Chao, Biometrika 69, 1982]
/// Cost  k words a block for the choice within it, k words a merge.
class slots_estimator {
 public:
  static constexpr bool own_error = true;

  slots_estimator(std::size_t k, std::uint64_t seed) : k_(k), seed_(seed) {}

  [[nodiscard]] std::tuple<> readout() const noexcept { return {}; }
  [[nodiscard]] slots_estimator fresh() const { return {k_, seed_}; }

  void take(block const& b) {
    first_ = b.first() / block_size;
    level_ = 0;
    std::span<double const> const weights = b.view(0, 0).weights;
    std::vector<double> upto(weights.size());
    for (std::size_t i = 0; i < weights.size(); ++i) upto[i] = sum_ += weights[i];
    if (!(sum_ > 0.0)) return;
    draws source(seed_, first_, purpose::merge, 64);
    samples_.resize(k_);
    weights_.resize(k_);
    for (std::size_t s = 0; s < k_; ++s) {
      double const at = source.uniform() * sum_;
      std::size_t const i = std::min(static_cast<std::size_t>(std::upper_bound(upto.begin(), upto.end(), at) - upto.begin()),
                                     weights.size() - 1);
      samples_[s] = b.samples()[i];
      weights_[s] = weights[i];
    }
  }
  void add(std::span<double const>, std::span<double const>, weighted_view const&) {}
  void rescale(double factor) {
    sum_ *= factor;
    for (double& each : weights_) each *= factor;
  }
  slots_estimator& operator+=(slots_estimator const& right) {
    double const total = sum_ + right.sum_;
    if (samples_.empty()) {
      samples_ = right.samples_;
      weights_ = right.weights_;
    } else if (!right.samples_.empty()) {
      double const share = total > 0.0 ? right.sum_ / total : 0.0;
      draws source(seed_, first_, purpose::merge, level_);
      for (std::size_t s = 0; s < k_; ++s)
        if (source.uniform() < share) {
          samples_[s] = right.samples_[s];
          weights_[s] = right.weights_[s];
        }
    }
    sum_ = total;
    ++level_;
    return *this;
  }

  [[nodiscard]] slots_result answer(run_facts const&) const {
    slots_result result{samples_, weights_};
    for (double& each : result.weights) each /= sum_;
    return result;
  }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.sum_, self.first_, self.level_, self.samples_, self.weights_);
  }

 private:
  std::size_t k_;
  std::uint64_t seed_;
  std::uint64_t first_ = 0;
  std::uint64_t level_ = 0;
  double sum_ = 0.0;
  std::vector<std::uint64_t> samples_;
  std::vector<double> weights_;
};

}  // namespace steelyard::inline v1::detail
