#include <steelyard/core.hpp>
#include <steelyard/instrument/normal_noise.hpp>
#include <steelyard/instrument/reading.hpp>

struct tank {
  double level;
};
struct river {
  double level;
};

int main() {
  auto sampler = [](steelyard::draws& draws) { return tank{draws.uniform()}; };
  auto const gauge = steelyard::reading("gauge", 0.4, &tank::level, steelyard::normal_noise(0.1));
  steelyard::pipeline const pipe{sampler, steelyard::together(gauge)};
  return pipe.expectation({.size = 1000}, &tank::level).value > 2.0;
}
