// expect: steelyard: this weighter returns a bare number, which could be a density or its logarithm
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  steelyard::together weighter{
      steelyard::named("gauge", [](double x) { return steelyard::log_likelihood{-x * x}; }),
      steelyard::named("meter", [](double x) { return -x; })};
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
