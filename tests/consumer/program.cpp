// SPDX-License-Identifier: BSL-1.0
// What every consumer project builds: the main job through the usual door. X ~ U(-1, 1), reading x^2 = 0.35 with sd 0.15;
// E[x^2 | reading] = 0.307856 by quadrature.
#include <steelyard/steelyard.hpp>

#include <cmath>
#include <iostream>

namespace sy = steelyard;

int main() {
  sy::pipeline pipe{[](sy::draws& draws) { return draws.uniform(-1.0, 1.0); },
                    [](double x) {
                      double const z = (0.35 - x * x) / 0.15;
                      return sy::log_likelihood{-0.5 * z * z};
                    }};
  sy::weighted_sample<double> const sample = pipe.run({.size = 20'000, .seed = 1});
  sy::estimate const square = sample.expectation([](double x) { return x * x; });
  std::cout << square << '\n' << sample.diagnosis() << '\n';
  bool const near = std::abs(square.value - 0.307856) < 5 * square.standard_error;
  return near && square.standard_error < 0.01 && square.verdict() == sy::verdict::sound ? 0 : 1;
}
