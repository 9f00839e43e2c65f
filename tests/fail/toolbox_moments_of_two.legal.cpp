#include <steelyard/core.hpp>

#include <array>
#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  sample.covariance([](double x) { return std::array{x, x * x}; });
}
