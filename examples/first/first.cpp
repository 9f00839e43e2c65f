// SPDX-License-Identifier: BSL-1.0
#include <iostream>
#include <steelyard/steelyard.hpp>
namespace sy = steelyard;
struct silo { double height, density; };  // metres of grain, t/m3

int main() {
  auto fill = [](sy::draws& draws) { return silo{draws.uniform(0.0, 8.0), draws.normal(0.76, 0.03)}; };
  auto mass = [](silo const& s) { return 12.0 * s.height * s.density; };   // tonnes on 12 m2 of floor
  sy::pipeline pipe{fill, sy::reading(41.3, mass, sy::normal_noise(0.5))};  // the load cells show 41.3 t
  auto const sample = pipe.run({.size = 100'000, .seed = 1});
  std::cout << "height of grain in m: " << sample.expectation(&silo::height) << '\n'
            << "chance of over 4.8 m: " << sample.probability([](silo const& s) { return s.height > 4.8; }) << '\n'
            << sample.diagnosis() << '\n';
}
