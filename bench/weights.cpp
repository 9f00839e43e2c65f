// SPDX-License-Identifier: BSL-1.0
// Log-weights to weights, their sum, sum of squares and maximum.
#include <cmath>
#include <limits>
#include <random>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace detail = steelyard::detail;

namespace {

std::vector<double> const& logs() {
  static std::vector<double> const all = [] {
    std::mt19937_64 engine(1);
    std::exponential_distribution<double> fall(0.2);
    std::vector<double> v(bench::samples());
    for (double& each : v) each = -fall(engine);
    return v;
  }();
  return all;
}

void ours_once(std::vector<double>& weights) {
  double const top = detail::block_maximum(logs());
  auto sums = detail::weights_from_logs(logs(), top, weights);
  benchmark::DoNotOptimize(sums);
}

void plain_exp(benchmark::State& state) {
  std::vector<double> ours(logs().size()), twin(logs().size());
  bench::compare(state, 5.0, bench::side{ours.size(), [&] { ours_once(ours); }}, bench::side{twin.size(), [&] {
    double const* const from = logs().data();
    double* const to = twin.data();
    std::size_t const n = twin.size();
    double top = std::numeric_limits<double>::lowest(), sum = 0.0, squares = 0.0;
    for (std::size_t i = 0; i < n; ++i) top = from[i] > top ? from[i] : top;
    for (std::size_t i = 0; i < n; ++i) {
      double const w = std::exp(from[i] - top);
      to[i] = w;
      sum += w;
      squares += w * w;
    }
    benchmark::DoNotOptimize(sum);
    benchmark::DoNotOptimize(squares);
  }});
}
BENCH_ROW(plain_exp, "weights from logs | std::exp loop", 15);

void plain_copy(benchmark::State& state) {
  std::vector<double> ours(logs().size()), twin(logs().size());
  bench::compare(state, 1.0 / 3.0, bench::side{ours.size(), [&] { ours_once(ours); }}, bench::side{twin.size(), [&] {
    std::copy(logs().begin(), logs().end(), twin.begin());
    benchmark::DoNotOptimize(twin.data());
    benchmark::ClobberMemory();
  }});
}
BENCH_ROW(plain_copy, "weights from logs | copy of the array", 30);

}  // namespace
