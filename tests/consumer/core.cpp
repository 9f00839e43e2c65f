// SPDX-License-Identifier: BSL-1.0
// The same through core.hpp, which brings in neither Boost nor xtensor.
#include <steelyard/core.hpp>

#if defined(BOOST_VERSION) || defined(BOOST_CONFIG_HPP) || defined(XTENSOR_VERSION_MAJOR)
#error "core.hpp brought in Boost or xtensor"
#endif

#include <cmath>

namespace sy = steelyard;

int main() {
  sy::pipeline pipe{[](sy::draws& draws) { return draws.uniform(-1.0, 1.0); },
                    [](double x) {
                      double const z = (0.35 - x * x) / 0.15;
                      return sy::log_likelihood{-0.5 * z * z};
                    }};
  sy::estimate const square = pipe.run({.size = 20'000, .seed = 1}).expectation([](double x) { return x * x; });
  bool const near = std::abs(square.value - 0.307856) < 5 * square.standard_error;
  return near && square.standard_error < 0.01 && square.verdict() == sy::verdict::sound ? 0 : 1;
}
