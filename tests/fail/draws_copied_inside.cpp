// expect: deleted
// The language speaks here, in its own words and few: no sentence of ours can come first.
#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) {
    auto mine = draws;
    return mine.uniform();
  };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  return pipe.expectation({.size = 1000}, [](double x) { return x; }).value > 2.0;
}
