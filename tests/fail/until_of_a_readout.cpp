// expect: steelyard: this is not an estimator
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto itself = [](double x) { return x; };
  auto const [mean] = pipe.estimate({}, steelyard::until(itself, 0.01));
  return mean.value > 2.0;
}
