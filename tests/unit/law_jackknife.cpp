// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>

#include <algorithm>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <vector>

// The default error of an own estimator: the delete-one-group jackknife [Miller, Biometrika 61, 1974], written out here
// plainly, with a whole new sum for each group left out.

namespace sy = steelyard;

namespace {

/// Weighted mean of the square, without an error of its own.
class mean_square {
 public:
  [[nodiscard]] auto readout() const {
    return [](double x) { return x; };
  }
  [[nodiscard]] mean_square fresh() const { return {}; }
  void add(std::span<double const> values, std::span<double const> weights) {
    for (std::size_t i = 0; i < weights.size(); ++i) {
      sum_ += weights[i] * values[i] * values[i];
      weight_ += weights[i];
    }
  }
  void rescale(double factor) {
    sum_ *= factor;
    weight_ *= factor;
  }
  mean_square& operator+=(mean_square const& other) {
    sum_ += other.sum_;
    weight_ += other.weight_;
    return *this;
  }
  [[nodiscard]] double value() const { return sum_ / weight_; }
  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.sum_, self.weight_);
  }

 private:
  double sum_ = 0.0, weight_ = 0.0;
};

struct ensemble_data {
  std::vector<double> x, log_weight;
};
ensemble_data data(std::size_t n) {
  ensemble_data all;
  sy::draws d(3, 0);
  for (std::size_t i = 0; i < n; ++i) {
    all.x.push_back(d.normal(0.3, 1.0));
    all.log_weight.push_back(-0.5 * std::pow(all.x.back() - 0.8, 2));
  }
  return all;
}

/// The error by hand: u_g = (1 - m_g) (mean of the values left over - value without g), that mean by weights 1 - m_g.
double by_hand(ensemble_data const& all, std::vector<std::size_t> const& group, std::size_t groups) {
  double const n = static_cast<double>(all.x.size());
  std::vector<double> share(groups), without(groups);
  for (std::size_t const g : group) share[g] += 1.0 / n;
  double middle = 0.0, whole = 0.0, squares = 0.0;
  for (std::size_t g = 0; g < groups; ++g) {
    double sum = 0.0, weight = 0.0;
    for (std::size_t i = 0; i < all.x.size(); ++i) {
      if (group[i] == g) continue;
      double const w = std::exp(all.log_weight[i]);
      sum += w * all.x[i] * all.x[i];
      weight += w;
    }
    without[g] = sum / weight;
    middle += (1.0 - share[g]) * without[g];
    whole += 1.0 - share[g];
    squares += share[g] * share[g];
  }
  double total = 0.0;
  for (std::size_t g = 0; g < groups; ++g) total += std::pow((1.0 - share[g]) * (middle / whole - without[g]), 2);
  return std::sqrt(total / (1.0 - squares));
}

}  // namespace

TEST_CASE("jackknife: groups are (sample / 16) mod 64, and each is left out once") {
  for (std::size_t const n : {40u, 1'000u, 3'000u}) {
    CAPTURE(n);
    ensemble_data const all = data(n);
    auto const sample = sy::weigh(all.x, [](double x) { return sy::log_likelihood{-0.5 * (x - 0.8) * (x - 0.8)}; });
    auto const answers = sample.estimate(mean_square());
    sy::estimate const e = answers.get<0>();
    std::vector<std::size_t> group;
    std::size_t groups = 0;
    for (std::size_t i = 0; i < n; ++i) {
      group.push_back(i / 16 % 64);
      groups = std::max(groups, group.back() + 1);
    }
    CHECK(e.groups() == static_cast<double>(groups));
    CHECK(e.standard_error == doctest::Approx(by_hand(all, group, groups)).epsilon(1e-9));
    CHECK(e.degrees_of_freedom == static_cast<double>(groups - 1));
  }
}

TEST_CASE("jackknife: labels of one's own, in groups of very different size") {
  ensemble_data const all = data(900);
  std::vector<std::uint32_t> labels;
  std::vector<std::size_t> group;
  for (std::size_t i = 0; i < all.x.size(); ++i) {
    group.push_back(i < 400 ? 0 : i < 600 ? 1 : 2 + i % 7);
    labels.push_back(static_cast<std::uint32_t>(100 * group.back() + 7));
  }
  auto const sample = sy::weigh(all.x, [](double x) { return sy::log_likelihood{-0.5 * (x - 0.8) * (x - 0.8)}; },
                                {.groups = labels});
  auto const answers = sample.estimate(mean_square());
  sy::estimate const e = answers.get<0>();
  CHECK(e.groups() == 9.0);
  CHECK(e.standard_error == doctest::Approx(by_hand(all, group, 9)).epsilon(1e-9));
}
