// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>

#include <steelyard/draw/draws.hpp>

/// An invented foundry: a casting seen as pores on a grid, and a grader that
/// scores what it sees. Neither comes with a density; both are black boxes to the rest.
namespace foundry {

inline constexpr std::size_t side = 16;  // cells of 2 mm: a section of 32 mm
inline constexpr double cell = 2.0;

enum class flaw : std::size_t { sound, shrinkage, gas };
using scores = std::array<double, 3>;

struct casting {
  std::array<float, side * side> pore_area{};  // mm^2 in each cell
  double largest_pore = 0.0;                   // mm, diameter
};

inline void add_pore(casting& c, double x, double y, double diameter) {
  auto const place = [](double at) { return static_cast<std::size_t>(std::clamp(at / cell, 0.0, static_cast<double>(side) - 1.0)); };
  c.pore_area[place(y) * side + place(x)] += static_cast<float>(0.7853981633974483 * diameter * diameter);
  c.largest_pore = std::max(c.largest_pore, diameter);
}

/// Our own porosity law. Hydrogen in the melt strews small round pores evenly;
/// a feeding deficit opens larger ones around the hot spot, which is near the middle.
inline casting pour(steelyard::draws& draws) {
  double const hydrogen = draws.exponential(1.0), deficit = draws.exponential(1.0 / 0.6);
  double const hot_x = draws.normal(16.0, 4.0), hot_y = draws.normal(16.0, 4.0), spread = draws.uniform(2.0, 6.0);
  casting c;
  for (double left = 14.0 * hydrogen - draws.exponential(1.0); left > 0.0; left -= draws.exponential(1.0))
    add_pore(c, draws.uniform(0.0, 32.0), draws.uniform(0.0, 32.0), 0.15 + draws.exponential(1.0 / 0.18));
  for (double left = 9.0 * deficit - draws.exponential(1.0); left > 0.0; left -= draws.exponential(1.0))
    add_pore(c, draws.normal(hot_x, spread), draws.normal(hot_y, spread),
             0.2 + draws.exponential(1.0 / (0.25 + 0.30 * deficit)));
  return c;
}

/// Scores for sound, shrinkage and gas: chances that the inspection line writes
/// each of the three on the card of this casting.
inline scores grade(casting const& c) {
  double area = 0.0, squares = 0.0, middle = 0.0;
  for (std::size_t i = 0; i < c.pore_area.size(); ++i) {
    double const a = c.pore_area[i];
    double const x = static_cast<double>(i % side) - 7.5, y = static_cast<double>(i / side) - 7.5;
    area += a;
    squares += a * a;
    if (x * x + y * y < 20.0) middle += a;
  }
  double const cells = static_cast<double>(side * side);
  double const clumped = area > 0.0 ? std::log(squares / (area * area) * cells) : 0.0;  // 0 when even
  double const share = area > 0.0 ? middle / area : 0.0;
  double const of_sound = 2.0 - 0.9 * std::sqrt(area), of_shrinkage = -1.6 + 0.35 * clumped + 3.2 * share + 0.12 * std::sqrt(area);
  double const of_gas = 1.4 - 0.4 * clumped - 2.0 * share + 0.25 * std::sqrt(area);
  scores s{std::exp(of_sound), std::exp(of_shrinkage), std::exp(of_gas)};
  double const sum = s[0] + s[1] + s[2];
  for (double& each : s) each /= sum;
  return s;
}

}  // namespace foundry
