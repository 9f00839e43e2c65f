#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  steelyard::pipeline const pipe{sampler, steelyard::bounded([](double x) { return steelyard::log_likelihood{-x}; }, 0.0)};
  return pipe.expectation({.size = 1000}, [](double x) { return x; }).value > 2.0;
}
