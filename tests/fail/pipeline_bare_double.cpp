// expect: steelyard: this weighter returns a bare number, which could be a density or its logarithm
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return -0.5 * x * x; };
  steelyard::pipeline pipe{sampler, weighter};
  (void)pipe.run({.size = 1000});
}
