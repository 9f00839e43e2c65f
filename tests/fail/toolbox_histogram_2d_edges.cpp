// expect: steelyard: histogram_2d() takes bins
#include <steelyard/core.hpp>

#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  auto itself = [](double x) { return x; };
  sample.histogram_2d(itself, itself, 10, 10);
}
