// SPDX-License-Identifier: BSL-1.0
// A sharp reading, and moves of your own for a tempered run: a block of words to be moved together, and an exact draw.
// One gauge sees a level to two millimetres, another the gap between two floats to five centimetres. The case is invented,
// and its answer known in closed form.

#include <array>
#include <cmath>
#include <iostream>

#include <steelyard/steelyard.hpp>
#include <steelyard/tempered.hpp>

namespace sy = steelyard;

struct floats {
  double level, left, right;  // m about a datum; what the floats add to it
};

int main() {
  constexpr double s = 2e-3, gap = 0.05;  // m, standard deviations of the gauges
  auto const sampler = [](sy::draws& draws) {
    return floats{draws.normal(), draws.normal(), draws.normal()};  // words 0, 1 and 2
  };
  sy::pipeline const pipe{
      sampler, sy::together(sy::reading("level", 0.3, &floats::level, sy::normal_noise(s)),
                            sy::reading("gap", 0.5, [](floats const& f) { return f.left - f.right; }, sy::normal_noise(gap)))};

  // Words 1 and 2 decide the gap together: a move that changes both a little.
  sy::refresh_together const both{1, 2};
  // Word 0, given the reading of the level to some power and all else, is normal: drawn exactly, and always accepted.
  sy::exact_draw const level(0, 1, [](floats const&, double power, sy::draws& draws, sy::block_words& words) {
    double const precision = 1.0 + power / (s * s), mean = 0.3 * power / (s * s) / precision;
    words.set_normal(0, mean + draws.normal() / std::sqrt(precision));
  });

  auto const sample = sy::run_tempered(pipe, {.seed = 1}, both, level);
  auto const height = sample.expectation(&floats::level), left = sample.expectation(&floats::left);
  std::cout << "level in m: " << height << "\nleft float in m: " << left << '\n'
            << sample.sampler_calls() << " calls of the sampler\n"
            << sample.diagnosis() << '\n';

  double const exact_height = 0.3 / (1.0 + s * s), exact_left = 0.5 / (2.0 + gap * gap);
  bool const right = std::abs(height.value - exact_height) <= 5.0 * height.standard_error &&
                     std::abs(left.value - exact_left) <= 5.0 * left.standard_error;
  return right && sample.diagnosis().verdict() == sy::verdict::sound ? 0 : 1;
}
