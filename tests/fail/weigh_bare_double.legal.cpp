#include <steelyard/core.hpp>

#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
