// expect: steelyard: this question needs all values at once
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::likelihood{x}; };
  steelyard::pipeline pipe{sampler, weighter};
  auto itself = [](double x) { return x; };
  pipe.estimate({.size = 1000}, steelyard::shortest_interval(itself, 0.9));
}
