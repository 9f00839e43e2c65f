// expect: steelyard: this weighter returns a bare number, which could be a density or its logarithm
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  steelyard::pipeline const pipe{sampler, steelyard::bounded([](double x) { return -x; }, 0.0)};
  return pipe.expectation({.size = 1000}, [](double x) { return x; }).value > 2.0;
}
