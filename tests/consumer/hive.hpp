// SPDX-License-Identifier: BSL-1.0
// What the consumers of the test kit test: an invented model. A beehive on a spring balance: honey in kilograms from
// a good or a poor summer, and a balance that errs by 1.5 kg.
#pragma once

#include <steelyard/steelyard.hpp>

#include <cmath>

namespace hive {

namespace sy = steelyard;

struct state {
  double honey = 0.0;  // kg
  bool good_summer = false;
};

inline constexpr double balance_error = 1.5;  // kg

inline state sampler(sy::draws& draws) {
  bool const good = draws.chance(0.6);
  return {good ? draws.normal(25.0, 4.0) : draws.normal(12.0, 3.0), good};
}
inline double weigh_hive(state const& s, sy::draws& draws) { return s.honey + balance_error * draws.normal(); }

/// The weighter of a reading. @param claimed  error that the balance is taken to have
inline auto weighter(double reading, double claimed = balance_error) {
  return [=](state const& s) {
    double const z = (reading - s.honey) / claimed;
    return sy::log_likelihood{-0.5 * z * z - std::log(claimed)};
  };
}

/// An own estimator: the geometric mean of honey above 1 kg.
class geometric_mean {
 public:
  [[nodiscard]] auto readout() const { return &state::honey; }
  [[nodiscard]] geometric_mean fresh() const { return {}; }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) {
      if (!(values[i] > 1.0)) continue;
      sum_ += weights[i] * std::log(values[i]);
      weight_ += weights[i];
    }
  }
  void rescale(double factor) {
    sum_ *= factor;
    weight_ *= factor;
  }
  geometric_mean& operator+=(geometric_mean const& other) {
    sum_ += other.sum_;
    weight_ += other.weight_;
    return *this;
  }
  [[nodiscard]] double value() const { return std::exp(sum_ / weight_); }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.sum_, self.weight_);
  }

 private:
  double sum_ = 0.0, weight_ = 0.0;
};

}  // namespace hive
