// expect: steelyard: this readout cannot read this state
#include <steelyard/core.hpp>

#include <string>
#include <vector>

int main() {
  std::vector<double> const states{1.0, 2.0, 4.0};
  auto const sample = steelyard::weigh(states, [](double x) { return steelyard::likelihood{x}; });
  sample.correlation([](double x) { return x; }, [](double x) { return std::to_string(x); });
}
