// SPDX-License-Identifier: BSL-1.0
#include "statistics/questions.hpp"

#include <steelyard/core.hpp>

#include <array>
#include <cmath>
#include <span>
#include <tuple>
#include <vector>

// Every estimator at once, compiled once for all programs that ask them.

namespace known {

namespace {

/// Weighted variance as a user would write it, without an error of its own: the library takes the jackknife.
class spread {
 public:
  [[nodiscard]] auto readout() const { return &point::x; }
  [[nodiscard]] spread fresh() const { return {}; }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) take(weights[i], values[i], 0.0);
  }
  void rescale(double factor) {
    weight_ *= factor;
    second_ *= factor;
  }
  spread& operator+=(spread const& other) {
    take(other.weight_, other.mean_, other.second_);
    return *this;
  }
  [[nodiscard]] double value() const { return second_ / weight_; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.weight_, self.mean_, self.second_);
  }

 private:
  void take(double weight, double mean, double second) {
    double const total = weight_ + weight;
    if (!(total > 0.0)) return;
    double const gap = mean - mean_;
    second_ += second + gap * gap * weight_ * (weight / total);
    mean_ += gap * (weight / total);
    weight_ = total;
  }

  double weight_ = 0.0, mean_ = 0.0, second_ = 0.0;
};

inline double square_of_x(point const& p) { return p.x * p.x; }

}  // namespace

std::vector<asked> ask_all(sy::weighted_sample<point> const& sample, problem const& p) {
  auto const x = &point::x;
  posterior const& exact = p.exact;
  double const edge = exact.quantile(1.0 - p.tail), second = exact.variance + exact.mean * exact.mean;
  auto const [low, high] = middle_bin(exact);
  double const inside = exact.below(high) - exact.below(low);
  auto const answers = sample.estimate(
      sy::expectation([](point const& s) { return std::array{s.x, s.x * s.x}; }),
      sy::probability([edge](point const& s) { return s.x > edge; }), sy::histogram(x, sy::bins({low, high})),
      sy::quantile(x, 0.5), sy::quantile(x, 0.9), sy::coverage_interval(x, 0.95), sy::log_evidence(),
      sy::difference(x, square_of_x), sy::ratio(x, square_of_x), spread());
  auto const& [both, probability, bins, median, upper, interval, log_evidence, difference, ratio, own] = answers;
  asked sum;
  sum.value = both[0].value + both[1].value;
  sum.truth = exact.mean + second;
  sum.standard_error = std::sqrt(both.covariance(0, 0) + 2.0 * both.covariance(0, 1) + both.covariance(1, 1));
  return {{both[0], exact.mean},
          {both[1], second},
          sum,
          {probability, 1.0 - exact.below(edge)},
          {bins.probability(0), inside},
          {bins.density(0), inside / (high - low)},
          {median, exact.quantile(0.5)},
          {upper, exact.quantile(0.9)},
          {interval.lower, exact.quantile(0.025)},
          {interval.upper, exact.quantile(0.975)},
          {log_evidence, exact.log_evidence},
          {difference, exact.mean - second},
          {ratio, exact.mean / second},
          {own, exact.variance}};
}

}  // namespace known
