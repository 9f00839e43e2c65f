#include <steelyard/core.hpp>
#include <steelyard/instrument/normal_noise.hpp>
#include <steelyard/instrument/reading.hpp>

struct tank {
  double level;
};

int main() {
  auto sampler = [](steelyard::draws& draws) { return tank{draws.uniform()}; };
  auto where = [](tank const& t) { return t.level; };
  steelyard::pipeline const pipe{sampler, steelyard::reading("gauge", 0.4, where, steelyard::normal_noise(0.1))};
  return pipe.expectation({.size = 1000}, &tank::level).value > 2.0;
}
