// expect: steelyard: this weighter returns a bare number, which could be a density or its logarithm
#include <steelyard/tempered.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return -50.0 * x * x; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = steelyard::run_tempered(pipe, {.seed = 1});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
