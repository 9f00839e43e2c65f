// SPDX-License-Identifier: BSL-1.0
// Vector readouts: arrays of any fixed length, xtensor rows, and answers as arrays.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <span>
#include <vector>

#include <steelyard/steelyard.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;

namespace {

/// A row: three numbers of covariance L L^T with L = [2 0 0; 1 1 0; 0 -0.5 3].
std::array<double, 3> correlated(sy::draws& draws) {
  double const a = draws.normal(), b = draws.normal(), c = draws.normal();
  return {2.0 * a, a + b, -0.5 * b + 3.0 * c};
}
constexpr double exact[3][3] = {{4.0, 2.0, 0.0}, {2.0, 2.0, -0.5}, {0.0, -0.5, 9.25}};
sy::likelihood even(std::array<double, 3> const&) { return sy::likelihood{1.0}; }

}  // namespace

TEST_CASE("arrays: covariance matrix of a normal law, with standard errors in closed form") {
  sy::pipeline const pipe{correlated, even};
  auto const itself = [](std::array<double, 3> const& x) { return x; };
  double const n = 40'000.0;
  auto const c = pipe.covariance({.size = 40'000, .seed = 3}, itself);
  for (std::size_t i = 0; i < 3; ++i)
    for (std::size_t j = 0; j < 3; ++j) {
      CAPTURE(i);
      CAPTURE(j);
      CHECK(law::errors_off(c(i, j), exact[i][j]) < 5.0);
      // Wishart: var c_ij = (c_ij^2 + c_ii c_jj) / n
      double const error = std::sqrt((exact[i][j] * exact[i][j] + exact[i][i] * exact[j][j]) / n);
      CHECK(c(i, j).standard_error == doctest::Approx(error).epsilon(0.05));
      // var r = (1 - rho^2)^2 / n
      double const rho = exact[i][j] / std::sqrt(exact[i][i] * exact[j][j]);
      if (i != j)
        CHECK(c.correlation(i, j).standard_error == doctest::Approx((1.0 - rho * rho) / std::sqrt(n)).epsilon(0.05));
    }
  auto const values = sy::covariances(c), errors = sy::covariance_errors(c);
  CHECK(values.shape()[0] == 3);
  CHECK(values(2, 1) == c(2, 1).value);
  CHECK(errors(0, 1) == c(0, 1).standard_error);
}

TEST_CASE("arrays: xtensor rows, fixed xtensors and std::array are read alike") {
  std::size_t const n = 2000;
  xt::xtensor<double, 2> rows = xt::xtensor<double, 2>::from_shape({n, 4});
  std::vector<std::array<double, 3>> states;
  for (std::size_t i = 0; i < n; ++i) {
    sy::draws draws(4, i);
    states.push_back(correlated(draws));
    rows(i, 0) = 77.0;
    for (std::size_t k = 0; k < 3; ++k) rows(i, k + 1) = states.back()[k];
  }
  auto const by_row = sy::weigh(rows, [](std::span<double const> row) { return sy::likelihood{std::exp(-row[1])}; });
  auto const by_array =
      sy::weigh(states, [](std::array<double, 3> const& x) { return sy::likelihood{std::exp(-x[0])}; });
  auto const a = by_row.covariance(sy::row_columns<3>(1)),
             b = by_array.covariance([](std::array<double, 3> const&x) { return x; });
  auto const c = by_array.covariance([](std::array<double, 3> const& x) {
    return xt::xtensor_fixed<double, xt::xshape<3>>{x[0], x[1], x[2]};
  });
  for (std::size_t i = 0; i < 3; ++i)
    for (std::size_t j = 0; j < 3; ++j) {
      CHECK(close(a(i, j), b(i, j), 0.0));
      CHECK(close(c(i, j), b(i, j), 0.0));
    }
  auto const means = by_row.expectation(sy::row_columns<3>(1)),
             same = by_array.expectation([](std::array<double, 3> const&x) { return x; });
  for (std::size_t i = 0; i < 3; ++i) CHECK(close(means[i], same[i], 0.0));
  CHECK(by_row.expectation(sy::row_columns<1>()).value == 77.0);
  CHECK(law::holds(law::said<sy::failed_sample>([&] { (void)by_row.expectation(sy::row_columns<4>(1)); }),
                   "a row of 4 numbers has no columns 1 to 4"));
  xt::xtensor_fixed<double, xt::xshape<2, 2>> const square{{1.0, 2.0}, {3.0, 4.0}};  // any shape: one column an element
  CHECK(by_row.expectation([&](std::span<double const>) { return square; })[2].value == 3.0);
}

TEST_CASE("arrays: densities in two dimensions as an array") {
  sy::pipeline const pipe{correlated, even};
  auto const h = pipe.histogram_2d(
      {.size = 5000}, [](auto const& x) { return x[0]; }, [](auto const& x) { return x[1]; },
      sy::equal_bins(-4.0, 4.0, 4), sy::equal_bins(-3.0, 3.0, 3));
  auto const all = sy::densities(h), errors = sy::density_errors(h);
  REQUIRE(all.shape()[0] == 4);
  REQUIRE(all.shape()[1] == 3);
  CHECK(all(1, 2) == h.density(1, 2).value);
  CHECK(errors(3, 0) == h.density(3, 0).standard_error);
}
