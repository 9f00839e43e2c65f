#include <steelyard/core.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto itself = [](double x) { return x; };
  auto const shares = pipe.histogram({.size = 1000}, itself, steelyard::equal_bins(0.0, 1.0, 20));
  return shares.probability(0).value > 2.0;
}
