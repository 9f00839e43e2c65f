// expect: steelyard: this question needs all values at once
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto itself = [](double x) { return x; };
  auto const [steps] = pipe.estimate({}, steelyard::cumulative(itself));
  (void)steps;
}
