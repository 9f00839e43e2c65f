// SPDX-License-Identifier: BSL-1.0
// Parts of one's own: an estimator, two executors, a progress line, and states
// of 1 MB that are made again instead of kept.
//
// Scenario (invented, with invented numbers): snow on a flat hall roof, as a
// grid of 256 x 512 depths. A black-box generator throws drifts on it; two
// stakes were read. Asked: the heaviest square metre, by its mean and by an
// exponential mean. No design check: local codes and licensed practice decide.
#include <sys/resource.h>

#include <cmath>
#include <cstddef>
#include <cstdio>
#include <vector>

#include <steelyard/core.hpp>

#include "exponential_mean.hpp"
#include "task_pool.hpp"

namespace sy = steelyard;

namespace {

constexpr std::size_t rows = 256, columns = 512;

struct roof {
  std::vector<double> depth;  // m, a cell is 0.25 m wide
  double density;             // kg/m^3
  double at(std::size_t r, std::size_t c) const { return depth[r * columns + c]; }
};

/// An even cover and six drifts, each a hill of random place, size and height.
roof snowfall(sy::draws& draws) {
  roof snow{std::vector<double>(rows * columns, draws.exponential(1.0 / 0.25)), draws.normal(220.0, 25.0)};
  for (int drift = 0; drift < 6; ++drift) {
    double const height = draws.exponential(1.0 / 0.3), wide = draws.uniform(8.0, 40.0);
    double const row = draws.uniform(0.0, rows), column = draws.uniform(0.0, columns);
    std::vector<double> along(columns);
    for (std::size_t c = 0; c < columns; ++c) {
      double const dc = (static_cast<double>(c) - column) / (2.0 * wide);
      along[c] = 1.0 / (1.0 + dc * dc);
    }
    for (std::size_t r = 0; r < rows; ++r) {
      double const dr = (static_cast<double>(r) - row) / wide, of_row = height / (1.0 + dr * dr);
      for (std::size_t c = 0; c < columns; ++c) snow.depth[r * columns + c] += of_row * along[c];
    }
  }
  return snow;
}

/// Stakes at two corners of the hall showed 0.55 m and 0.70 m, each good to 0.15 m.
sy::log_likelihood stakes(roof const& snow) {
  double const a = (snow.at(40, 60) - 0.55) / 0.15, b = (snow.at(200, 430) - 0.70) / 0.15;
  return sy::log_likelihood{-0.5 * (a * a + b * b)};
}

/// Heaviest square metre, in kN/m^2: 4 x 4 cells.
double heaviest(roof const& snow) {
  double worst = 0.0;
  for (std::size_t r = 0; r + 4 <= rows; r += 4)
    for (std::size_t c = 0; c + 4 <= columns; c += 4) {
      double sum = 0.0;
      for (std::size_t k = 0; k < 16; ++k) sum += snow.at(r + k / 4, c + k % 4);
      worst = sum > worst ? sum : worst;
    }
  return worst / 16.0 * snow.density * 9.81e-3;
}

double peak_megabytes() {
  rusage use{};
  getrusage(RUSAGE_SELF, &use);
  return static_cast<double>(use.ru_maxrss) / 1024.0;
}

}  // namespace

int main() {
  sy::pipeline pipe{&snowfall, &stakes};
  sy::plan plan{.size = 2'000, .seed = 11, .keep = sy::keeping::streams};
  plan.progress = [](sy::progress_report const& so_far) {
    std::printf("\r%5.1f %% of the roofs drawn", 100.0 * static_cast<double>(so_far.drawn) / static_cast<double>(so_far.planned));
    std::fflush(stdout);
  };

  task_pool pool(2);
  plan.executor = [&pool](std::size_t n, sy::executor::task const& f) { pool.run(n, f); };
  auto const sample = pipe.run(plan);
  std::printf("\n");
  auto const [mean, severe] = sample.estimate(sy::expectation(&heaviest), exponential_mean(&heaviest, 0.5));

  plan.executor = [](std::size_t n, sy::executor::task const& f) {
#if defined(_OPENMP)
#pragma omp parallel for schedule(dynamic)
#endif
    for (std::size_t i = 0; i < n; ++i) f(i);
  };
  plan.progress = {};
  auto const [again, severe_again] = pipe.estimate(plan, sy::expectation(&heaviest), exponential_mean(&heaviest, 0.5));

  std::printf("heaviest square metre, mean            %s kN/m2\n", to_string(mean).c_str());
  std::printf("heaviest square metre, exponential mean %s kN/m2\n", to_string(severe).c_str());
  std::printf("%s\n", to_string(sample.diagnosis()).c_str());
  double const peak = peak_megabytes();
  std::printf("2000 states of 1 MB were looked at with a peak memory of %.0f MB; the sampler was called %llu times\n", peak,
              static_cast<unsigned long long>(sample.sampler_calls()));

  bool const same = mean.value == again.value && severe.value == severe_again.value &&
                    mean.standard_error == again.standard_error;
  bool const fine = same && severe.value > mean.value && severe.standard_error > 0.0 && peak < 400.0;
  std::printf("%s\n", same ? "pool and OpenMP agree to the bit" : "pool and OpenMP differ");
  return fine ? 0 : 1;
}
