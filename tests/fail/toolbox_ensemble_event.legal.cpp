#include <steelyard/core.hpp>

#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  auto const ensemble = sample.resample(10, {.scheme = steelyard::scheme::stratified});
  (void)ensemble.probability([](double x) { return x > 1.0; });
}
