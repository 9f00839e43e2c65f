// SPDX-License-Identifier: BSL-1.0
#pragma once

// One question of each kind, those of a user's own among them, for laws that
// hold for every estimator.

#include <array>
#include <cmath>
#include <cstddef>
#include <span>
#include <tuple>
#include <utility>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace law {

/// A user's estimator without an error of its own: standard deviation of a
/// readout, sd^2 = sum W (f - mu)^2 Kish / (Kish - 1).
template <class Readout>
class spread_estimator {
 public:
  explicit spread_estimator(Readout of) : readout_(std::move(of)) {}
  auto const& readout() const { return readout_; }
  spread_estimator fresh() const { return spread_estimator(readout_); }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < values.size(); ++i) {
      double const w = weights[i], gap = values[i] - mean_;
      weight_ += w;
      squares_of_weights_ += w * w;
      if (!(weight_ > 0.0)) continue;
      mean_ += gap * (w / weight_);
      second_ += w * gap * (values[i] - mean_);
    }
  }
  void rescale(double factor) {
    weight_ *= factor;
    squares_of_weights_ *= factor * factor;
    second_ *= factor;
  }
  spread_estimator& operator+=(spread_estimator const& other) {
    double const total = weight_ + other.weight_, gap = other.mean_ - mean_;
    if (!(total > 0.0)) return *this;
    second_ += other.second_ + gap * gap * (weight_ * (other.weight_ / total));
    mean_ += gap * (other.weight_ / total);
    weight_ = total;
    squares_of_weights_ += other.squares_of_weights_;
    return *this;
  }
  double value() const {
    double const kish = weight_ * (weight_ / squares_of_weights_);
    return std::sqrt(second_ / weight_ * (kish / (kish - 1.0)));
  }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.weight_, self.squares_of_weights_, self.mean_, self.second_);
  }

 private:
  Readout readout_;
  double weight_ = 0.0, squares_of_weights_ = 0.0, mean_ = 0.0, second_ = 0.0;
};
template <class Readout>
auto spread(Readout readout) {
  return spread_estimator<Readout>(std::move(readout));
}

/// A user's estimator of two readouts that brings its own error: mean of their
/// product, u = W (f g - mean).
template <class First, class Second>
class product_estimator {
 public:
  static constexpr bool own_error = true;

  product_estimator(First first, Second second) : readouts_(std::move(first), std::move(second)) {}
  auto const& readout() const { return readouts_; }
  product_estimator fresh() const { return {std::get<0>(readouts_), std::get<1>(readouts_)}; }
  void add(std::span<double const> values, std::span<double const> weights, sy::weighted_view const& view) {
    std::size_t const n = weights.size();
    for (std::size_t i = 0; i < n; ++i) {
      double const w = weights[i], x = values[i] * values[n + i], m = view.count(i);
      sums_[0] += m * w;
      sums_[1] += m * w * x;
      for (std::size_t k = 0; k < 3; ++k) sums_[2 + k] += m * w * w * (k == 0 ? 1.0 : k == 1 ? x : x * x);
    }
  }
  void rescale(double factor) {
    for (std::size_t k = 0; k < 5; ++k) sums_[k] *= k < 2 ? factor : factor * factor;
  }
  product_estimator& operator+=(product_estimator const& other) {
    for (std::size_t k = 0; k < 5; ++k) sums_[k] += other.sums_[k];
    return *this;
  }
  sy::estimate answer(sy::run_facts const& facts) const {
    double const mean = sums_[1] / sums_[0], total = sums_[0] * sums_[0];
    double const squares = (sums_[4] - 2.0 * mean * sums_[3] + mean * mean * sums_[2]) / total;
    return sy::estimate(mean, {squares, squares * squares / facts.effective_size(), 0.0}, facts);
  }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.sums_);
  }

 private:
  std::tuple<First, Second> readouts_;
  std::array<double, 5> sums_{};
};
template <class First, class Second>
auto product(First first, Second second) {
  return product_estimator<First, Second>(std::move(first), std::move(second));
}

inline double squared(double x) { return x * x + 1.0; }
inline std::array<double, 3> powers(double x) { return {x, x * x, x * x * x}; }
inline bool rare(double x) { return x > 2.4; }
inline bool impossible_event(double x) { return x > 1e9; }

/// Questions that one pass can answer, on states that are numbers.
inline auto one_pass_questions() {
  return std::tuple(sy::expectation(itself), sy::expectation(powers), sy::probability(above_one), sy::probability(rare),
                    sy::probability(impossible_event), sy::histogram(itself, sy::equal_bins(-2.0, 2.0, 7)),
                    sy::histogram(itself), sy::log_evidence(), sy::ratio(itself, squared), sy::difference(squared, itself),
                    spread(itself), product(itself, squared));
}
/// And those that need the whole sample.
inline auto kept_questions() {
  return std::tuple_cat(one_pass_questions(),
                        std::tuple(sy::quantile(itself, 0.5), sy::quantile(itself, 0.99), sy::coverage_interval(itself, 0.9)));
}

template <class X>
auto ask_one_pass(sy::weighted_sample<X> const& sample) {
  return std::apply([&](auto const&... each) { return sample.estimate(each...); }, one_pass_questions());
}
template <class X>
auto ask_everything(sy::weighted_sample<X> const& sample) {
  return std::apply([&](auto const&... each) { return sample.estimate(each...); }, kept_questions());
}
template <class Pipeline>
auto ask_one_pass(Pipeline const& pipe, sy::plan const& plan) {
  return std::apply([&](auto const&... each) { return pipe.estimate(plan, each...); }, one_pass_questions());
}

}  // namespace law
