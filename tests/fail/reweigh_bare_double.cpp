// expect: steelyard: this weighter returns a bare number, which could be a density or its logarithm
#include <steelyard/core.hpp>

#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  auto const again = sample.reweigh([](double x) { return -x; });
  return again.expectation([](double x) { return x; }).value > 2.0;
}
