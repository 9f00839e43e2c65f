#include <steelyard/tempered.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.normal(); };
  auto const high = steelyard::low_probability(sampler, [](double x) { return x - 4.0; }, {});
  return high.value > 2.0;
}
