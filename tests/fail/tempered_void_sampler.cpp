// expect: steelyard: this sampler returns nothing
#include <steelyard/tempered.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-50.0 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const sample = steelyard::run_tempered(pipe, {.seed = 1});
  return sample.expectation([](double x) { return x; }).value > 2.0;
}
