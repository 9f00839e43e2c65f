#include <steelyard/core.hpp>

#include <string>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = pipe.run({.size = 1000});
  auto const length = sample.expectation([](double x) { return std::to_string(x).size(); });
  return length.value > 2.0;
}
