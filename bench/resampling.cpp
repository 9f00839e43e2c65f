// SPDX-License-Identifier: BSL-1.0
// Systematic and multinomial resampling: indices, set-up included.
#include <cstdint>
#include <random>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

#if defined(STEELYARD_BENCH_GSL)
#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#endif

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

std::vector<double> weights_of(std::size_t n) {
  std::mt19937_64 engine(2);
  std::exponential_distribution<double> fall(1.0);
  std::vector<double> v(n);
  for (double& each : v) each = fall(engine);
  return v;
}

template <class Positions>
void keep(Positions const& positions) {
  benchmark::DoNotOptimize(positions.data());
  benchmark::ClobberMemory();
}

/// As many draws as a user's own loop makes with the standard distribution.
void standard(std::vector<double> const& weights, std::vector<std::size_t>& positions) {
  std::mt19937_64 engine(3);
  std::discrete_distribution<std::size_t> pick(weights.begin(), weights.end());
  for (std::size_t& each : positions) each = pick(engine);
  keep(positions);
}

void two_pointers(benchmark::State& state) {
  std::vector<double> const weights = weights_of(bench::samples());
  std::size_t const n = weights.size();
  std::uint64_t turn = 0;
  std::vector<std::size_t> ours(n), positions(n);
  bench::compare(state, 5.0, bench::side{n, [&] {
                   detail::systematic_positions(weights, sy::draws(1, ++turn).uniform(), ours);
                   keep(ours);
                 }},
                 bench::side{n, [&] {
                   double total = 0.0;
                   for (double const w : weights) total += w;
                   double const step = total / static_cast<double>(n);
                   double next = sy::draws(1, turn).uniform() * step, sum = weights[0];
                   std::size_t i = 0;
                   for (std::size_t j = 0; j < n; ++j) {
                     while (sum <= next && i + 1 < n) sum += weights[++i];
                     positions[j] = i;
                     next += step;
                   }
                   keep(positions);
                 }});
}
BENCH_ROW(two_pointers, "systematic, N of N | two-pointer loop", 15);

void systematic_standard(benchmark::State& state) {
  std::vector<double> const weights = weights_of(bench::samples());
  std::size_t const n = weights.size(), few = bench::samples(300'000);
  std::uint64_t turn = 0;
  std::mt19937_64 engine(3);
  std::discrete_distribution<std::size_t> pick(weights.begin(), weights.end());
  std::vector<std::size_t> ours(n), positions(few);
  bench::compare(state, 100.0, bench::side{n, [&] {
                   detail::systematic_positions(weights, sy::draws(1, ++turn).uniform(), ours);
                   keep(ours);
                 }},
                 bench::side{few, [&] {  // the draws alone, its set-up left out
                   for (std::size_t& each : positions) each = pick(engine);
                   keep(positions);
                 }});
}
BENCH_ROW(systematic_standard, "systematic, N of N | std::discrete_distribution", 8);

void multinomial_standard(benchmark::State& state) {
  std::vector<double> const weights = weights_of(bench::samples(1'000'000));
  std::size_t const n = weights.size();
  std::uint64_t turn = 0;
  std::vector<std::size_t> ours(n), positions(n);
  bench::compare(state, 20.0, bench::side{n, [&] {
                   sy::draws source(1, ++turn);
                   detail::multinomial_positions(weights, source, ours);
                   keep(ours);
                 }},
                 bench::side{n, [&] { standard(weights, positions); }});
}
BENCH_ROW(multinomial_standard, "multinomial, 1e6 of 1e6 | std::discrete_distribution", 8);

void multinomial_gsl(benchmark::State& state) {
#if defined(STEELYARD_BENCH_GSL)
  std::vector<double> const weights = weights_of(bench::samples(1'000'000));
  std::size_t const n = weights.size();
  std::vector<std::size_t> ours(n), positions(n);
  gsl_rng* const engine = gsl_rng_alloc(gsl_rng_mt19937);
  std::uint64_t turn = 0;
  bench::compare(state, 4.0, bench::side{n, [&] {
                   sy::draws source(1, ++turn);
                   detail::multinomial_positions(weights, source, ours);
                   keep(ours);
                 }},
                 bench::side{n, [&] {
                   gsl_ran_discrete_t* const table = gsl_ran_discrete_preproc(n, weights.data());
                   for (std::size_t& each : positions) each = gsl_ran_discrete(engine, table);
                   gsl_ran_discrete_free(table);
                   keep(positions);
                 }});
  gsl_rng_free(engine);
#else
  bench::left_out(state, "the GNU Scientific Library was not found");
#endif
}
BENCH_ROW(multinomial_gsl, "multinomial, 1e6 of 1e6 | gsl_ran_discrete", 20);

}  // namespace
