#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const high = pipe.run({.size = 1000}).given([](double x) { return x > 0.5; });
  return high.log_evidence().value > 2.0;
}
