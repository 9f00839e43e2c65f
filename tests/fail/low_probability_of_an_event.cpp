// expect: steelyard: low_probability() takes a margin: a readout that returns one number, not bool
#include <steelyard/tempered.hpp>

int main() {
  auto sampler = [](steelyard::draws& draws) { return draws.normal(); };
  auto const high = steelyard::low_probability(sampler, [](double x) { return x > 4.0; }, {});
  return high.value > 2.0;
}
