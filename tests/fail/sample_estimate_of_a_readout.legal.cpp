#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  auto const [mean] = sample.estimate(steelyard::expectation([](double x) { return x; }));
  return mean.value > 2.0;
}
