// SPDX-License-Identifier: BSL-1.0
// Which combinations of three unknowns has a reading pinned down? The covariance matrix of a vector readout, with error
// bars, and its principal directions by Jacobi rotations. Three boreholes tap one aquifer; only the middle one is read.
// All invented.
#include <steelyard/steelyard.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <cstdio>

namespace sy = steelyard;
using levels = std::array<double, 3>;
using matrix = std::array<levels, 3>;

levels aquifer(sy::draws& draws) {  // metres: one level for all, one slope, and a little of its own for each
  double const common = draws.normal(12.0, 1.5), slope = draws.normal(0.0, 0.8);
  return {common - slope + draws.normal(0.0, 0.3), common + draws.normal(0.0, 0.3),
          common + slope + draws.normal(0.0, 0.3)};
}

/// Rotates a symmetric matrix to diagonal form; the columns of what it returns are the directions.
matrix principal_directions(matrix& a) {
  matrix v{{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}};
  for (int turn = 0; turn < 60; ++turn) {
    std::size_t const p = turn % 3 == 2 ? 1u : 0u, q = turn % 3 == 0 ? 1u : 2u;
    double const angle = 0.5 * std::atan2(2.0 * a[p][q], a[q][q] - a[p][p]), c = std::cos(angle), s = std::sin(angle);
    auto const mix = [c, s](double& x, double& y) {
      double const old = x;
      x = c * old - s * y;
      y = s * old + c * y;
    };
    for (std::size_t k = 0; k < 3; ++k) mix(a[k][p], a[k][q]);
    for (std::size_t k = 0; k < 3; ++k) mix(a[p][k], a[q][k]);
    for (std::size_t k = 0; k < 3; ++k) mix(v[k][p], v[k][q]);
  }
  return v;
}

int main() {
  auto const middle = sy::reading(
      "middle borehole", 13.1, [](levels const& h) { return h[1]; }, sy::normal_noise(0.1));
  auto const sample = sy::pipeline{aquifer, middle}.run({.size = 200'000, .seed = 11, .threads = 2});
  auto const covariance = sample.covariance([](levels const& h) { return h; });

  // A linear model with normal errors: the exact posterior covariance is C - c c^T / (C_11 + 0.1^2), c the middle
  // column of C.
  bool ok = true;
  matrix exact{}, found{};
  for (std::size_t i = 0; i < 3; ++i)
    for (std::size_t j = 0; j < 3; ++j) {
      double const prior =
          2.25 + 0.64 * (static_cast<double>(i) - 1.0) * (static_cast<double>(j) - 1.0) + (i == j ? 0.09 : 0.0);
      double const ci = i == 1 ? 2.34 : 2.25, cj = j == 1 ? 2.34 : 2.25;
      exact[i][j] = prior - ci * cj / (2.34 + 0.01);
      found[i][j] = covariance(i, j).value;
      ok = ok && std::abs(found[i][j] - exact[i][j]) < 5.0 * covariance(i, j).standard_error;
    }
  matrix const directions = principal_directions(found);
  std::array<std::size_t, 3> order{0, 1, 2};  // the best known first
  std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return found[a][a] < found[b][b]; });
  std::printf("Spread of the levels along each direction (west, middle, east), before and after the reading\n");
  for (std::size_t const k : order) {
    levels const v{directions[0][k], directions[1][k], directions[2][k]};
    auto const along = [v](levels const& h) { return v[0] * h[0] + v[1] * h[1] + v[2] * h[2]; };
    sy::estimate const before = sample.before().moments(along).sd, after = sample.moments(along).sd;
    std::printf("  (%5.2f, %5.2f, %5.2f)\n      before  %s m\n      after   %s m\n", v[0], v[1], v[2], to_string(before).c_str(),
                to_string(after).c_str());
    double variance = 0.0;
    for (std::size_t i = 0; i < 3; ++i)
      for (std::size_t j = 0; j < 3; ++j) variance += v[i] * exact[i][j] * v[j];
    ok = ok && std::abs(after.value - std::sqrt(variance)) < 5.0 * after.standard_error;
    for (std::size_t i = 0; i < 3; ++i) ok = ok && (i == k || std::abs(found[i][k]) < 1e-9);
  }
  return ok ? 0 : 1;
}
