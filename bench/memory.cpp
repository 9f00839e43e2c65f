// SPDX-License-Identifier: BSL-1.0
// Memory beside the states, counted at every allocation: bytes a sample where samples are kept, the peak of a pass that
// keeps nothing.
#include <algorithm>
#include <atomic>
#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <malloc.h>
#include <new>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace {
std::atomic<std::size_t> live{0}, peak{0};
}

void* operator new(std::size_t size) {
  void* const p = std::malloc(size);
  if (p == nullptr) throw std::bad_alloc();
  std::size_t const now = live += malloc_usable_size(p);
  std::size_t seen = peak;
  while (now > seen && !peak.compare_exchange_weak(seen, now)) {
  }
  return p;
}
void operator delete(void* p) noexcept {
  if (p != nullptr) live -= malloc_usable_size(p);
  std::free(p);
}
void operator delete(void* p, std::size_t) noexcept { operator delete(p); }

namespace sy = steelyard;

namespace {

auto const draw = [](sy::draws& d) { return d.uniform(); };
auto const reading = [](double x) { return sy::log_likelihood{-2.0 * (x - 0.4) * (x - 0.4)}; };
auto const itself = [](double x) { return x; };

template <class Make>
void bytes_a_sample(benchmark::State& state, double wanted, std::size_t n, double of_states, Make make) {
  double bytes = 0.0;
  for (auto _ : state) {
    std::size_t const before = live;
    auto const sample = make();
    benchmark::DoNotOptimize(sample.size());
    bytes = static_cast<double>(live - before) / static_cast<double>(n) - of_states;
    state.SetIterationTime(1e-3);
  }
  state.counters["bytes"] = bytes;
  state.counters["allowed"] = wanted;
}

void kept(benchmark::State& state) {
  std::size_t const n = bench::samples(1'000'000);
  bytes_a_sample(state, 16.0, n, sizeof(double), [&] { return sy::pipeline(draw, reading).run({.size = n}); });
}
void kept_named(benchmark::State& state) {
  std::size_t const n = bench::samples(1'000'000);
  auto const two = sy::together(sy::named("one", reading), sy::named("two", reading));
  bytes_a_sample(state, 32.0, n, sizeof(double), [&] { return sy::pipeline(draw, two).run({.size = n}); });
}
void streams(benchmark::State& state) {
  std::size_t const n = bench::samples(1'000'000);
  bytes_a_sample(state, 16.0, n, 0.0, [&] { return sy::pipeline(draw, reading).run({.size = n, .keep = sy::keeping::streams}); });
}
void kept_grouped(benchmark::State& state) {
  std::size_t const n = bench::samples(1'000'000);
  bytes_a_sample(state, 20.0, n, sizeof(double), [&] {
    std::vector<double> states(n);
    std::vector<std::uint32_t> groups(n);
    for (std::size_t i = 0; i < n; ++i) states[i] = static_cast<double>(i % 1000) * 1e-3, groups[i] = static_cast<std::uint32_t>(i % 50);
    return sy::weigh(std::move(states), reading, {.groups = std::move(groups)});
  });
}
BENCH_ROW(kept, "bytes a sample beside the states | states kept", 1);
BENCH_ROW(kept_named, "bytes a sample beside the states | states kept, two named readings", 1);
BENCH_ROW(kept_grouped, "bytes a sample beside the states | states kept, grouped", 1);
BENCH_ROW(streams, "bytes a sample beside the states | streams kept", 1);

void one_pass(benchmark::State& state, std::size_t n) {
  std::size_t most = 0;
  for (auto _ : state) {
    std::size_t const before = live;
    peak = before;
    benchmark::DoNotOptimize(sy::pipeline(draw, reading)
                                 .estimate({.size = n}, sy::expectation(itself), sy::histogram(itself), sy::log_evidence())
                                 .drawn());
    most = std::max(most, peak - before);
    state.SetIterationTime(1e-3);
  }
  state.counters["peak_MB"] = static_cast<double>(most) / 1e6;
  state.counters["allowed"] = 50.0;
}
void one_pass_small(benchmark::State& state) { one_pass(state, bench::samples(1'000'000)); }
void one_pass_large(benchmark::State& state) { one_pass(state, bench::samples(16'000'000)); }
BENCH_ROW(one_pass_small, "peak of one pass | 10^6 samples", 1);
BENCH_ROW(one_pass_large, "peak of one pass | 1.6 10^7 samples", 1);

}  // namespace
