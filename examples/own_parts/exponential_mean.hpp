// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <span>
#include <tuple>
#include <utility>

/// An estimator of one's own: the exponential mean (1/a) ln E exp(a f), a mean
/// that gives bad cases more say the larger a is. It states no error of its
/// own, so the library adds one by the delete-one-group jackknife.
template <class Readout>
class exponential_mean {
 public:
  exponential_mean(Readout load, double a) : readout_(std::move(load)), a_(a) {}

  Readout const& readout() const { return readout_; }
  exponential_mean fresh() const { return {readout_, a_}; }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) {
      weight_ += weights[i];
      sum_ += weights[i] * std::exp(a_ * values[i]);
    }
  }
  void rescale(double factor) {
    weight_ *= factor;
    sum_ *= factor;
  }
  exponential_mean& operator+=(exponential_mean const& other) {
    weight_ += other.weight_;
    sum_ += other.sum_;
    return *this;
  }
  double value() const { return std::log(sum_ / weight_) / a_; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.weight_, self.sum_);
  }

 private:
  Readout readout_;
  double a_;
  double weight_ = 0.0;
  double sum_ = 0.0;
};
