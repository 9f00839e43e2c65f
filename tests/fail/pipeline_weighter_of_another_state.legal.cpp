#include <steelyard/core.hpp>

#include <string>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double level) { return steelyard::likelihood{level < 0.5 ? 0.0 : 1.0}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
