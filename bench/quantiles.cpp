// SPDX-License-Identifier: BSL-1.0
// A quantile and an equal-tailed interval, with their error bars, beside a sort of (value, weight) pairs.
#include <algorithm>
#include <random>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace sy = steelyard;

namespace {

struct data {
  std::vector<double> values, weights;
  explicit data(std::size_t n) : values(n), weights(n) {
    std::mt19937_64 engine(5);
    std::normal_distribution<double> normal;
    std::exponential_distribution<double> fall(1.0);
    for (double& each : values) each = normal(engine);
    for (double& each : weights) each = fall(engine);
  }
};
data const& all() {
  static data const made(bench::samples());
  return made;
}
auto const itself = [](double x) { return x; };

double by_sort(std::initializer_list<double> levels) {
  std::vector<std::pair<double, double>> pairs(all().values.size());
  for (std::size_t i = 0; i < pairs.size(); ++i) pairs[i] = {all().values[i], all().weights[i]};
  std::sort(pairs.begin(), pairs.end(), [](auto const& a, auto const& b) { return a.first < b.first; });
  double total = 0.0, found = 0.0;
  for (auto const& each : pairs) total += each.second;
  for (double const p : levels) {
    double sum = 0.0;
    for (auto const& each : pairs)
      if ((sum += each.second) >= p * total) {
        found += each.first;
        break;
      }
  }
  return found;
}

template <class Estimator>
auto answer(Estimator sums) {
  sy::weighted_view view;
  view.values = all().values;
  view.weights = all().weights;
  sums.add(view.values, view.weights, view);
  sy::run_facts facts;
  facts.drawn = all().values.size();
  return sums.answer(facts);
}

void quantile(benchmark::State& state) {
  std::size_t const n = all().values.size();
  bench::compare(state, 3.0, bench::side{n, [&] { benchmark::DoNotOptimize(answer(sy::quantile(itself, 0.9)).standard_error); }},
                 bench::side{n, [&] { benchmark::DoNotOptimize(by_sort({0.9})); }});
}
BENCH_ROW(quantile, "quantile | sort of pairs", 5);

void interval(benchmark::State& state) {
  std::size_t const n = all().values.size();
  bench::compare(state, 3.0,
                 bench::side{n, [&] { benchmark::DoNotOptimize(answer(sy::coverage_interval(itself, 0.95)).lower.standard_error); }},
                 bench::side{n, [&] { benchmark::DoNotOptimize(by_sort({0.025, 0.975})); }});
}
BENCH_ROW(interval, "equal-tailed interval | sort of pairs", 5);

void kept(benchmark::State& state) {
  std::size_t const n = all().values.size();
  auto const sample = sy::weigh(std::span<double const>(all().values), [](double) { return sy::log_likelihood{0.0}; },
                                {.prior_weights = all().weights});
  bench::compare(state, 3.0, bench::side{n, [&] { benchmark::DoNotOptimize(sample.interval(itself, 0.95).lower.standard_error); }},
                 bench::side{n, [&] { benchmark::DoNotOptimize(by_sort({0.025, 0.975})); }});
}
BENCH_ROW(kept, "equal-tailed interval of a kept sample, readouts included | sort of pairs", 3);

}  // namespace
