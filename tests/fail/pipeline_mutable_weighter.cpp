// expect: steelyard: this weighter changes itself when called
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [calls = 0](double x) mutable { return steelyard::log_likelihood{-0.5 * x * ++calls}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
