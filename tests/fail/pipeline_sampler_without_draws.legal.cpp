#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws&) { return 0.5; };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
