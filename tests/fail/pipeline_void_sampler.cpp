// expect: steelyard: this sampler returns nothing
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
