#include <steelyard/core.hpp>

int main() {
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  auto sampler = steelyard::per_worker([] { return [](steelyard::draws& draws) { return draws.uniform(); }; });
  steelyard::pipeline const pipe{sampler, weighter};
  auto itself = [](double x) { return x; };
  return pipe.expectation({.size = 1000}, itself).value > 2.0;
}
