#include <steelyard/core.hpp>

#include <string>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.uniform(); };
  auto weighter = [](double x) { return steelyard::log_likelihood{-0.5 * x * x}; };
  steelyard::pipeline const pipe{sampler, weighter};
  auto const highest = pipe.mode({}, [](double x) { return std::to_string(x).size(); });
  (void)highest;
}
