// expect: steelyard: this sampler changes itself when called
#include <steelyard/core.hpp>

int main() {
  auto sampler = [calls = 0](steelyard::draws& draws) mutable { return draws.uniform() + ++calls; };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline pipe{sampler, weighter};
  (void)pipe.run({.size = 1000});
}
