// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <algorithm>
#include <cstddef>
#include <cstdlib>
#include <ctime>
#include <string>

#include <benchmark/benchmark.h>

// One row of the speed table: a piece of the library beside its twin, in turn within one process, the best of many
// repeats of each in processor time of the calling thread. What counts is the ratio.

namespace bench {

/// Samples in a row; the tests that only show that a bench runs ask for few.
inline std::size_t samples(std::size_t usual = 10'000'000) {
  char const* const asked = std::getenv("STEELYARD_BENCH_SAMPLES");
  return asked == nullptr ? usual : std::min(usual, static_cast<std::size_t>(std::strtoull(asked, nullptr, 10)));
}

inline double seconds(clockid_t clock) {
  timespec t{};
  clock_gettime(clock, &t);
  return static_cast<double>(t.tv_sec) + 1e-9 * static_cast<double>(t.tv_nsec);
}

/// Seconds that one call of `work` takes.
template <class Work>
double time_of(Work&& work, clockid_t clock = CLOCK_THREAD_CPUTIME_ID) {
  double const before = seconds(clock);
  work();
  return seconds(clock) - before;
}

/// One side of a row: what it does, and for how many samples.
template <class Work>
struct side {
  std::size_t n;
  Work work;
};
template <class Work>
side(std::size_t, Work) -> side<Work>;

/// Runs both sides in turn. Counters: ns a sample of each, `ratio` = twin over ours, and the ratio that is wanted.
template <class Ours, class Twin>
void compare(benchmark::State& state, double wanted, side<Ours> ours, side<Twin> twin,
             clockid_t clock = CLOCK_THREAD_CPUTIME_ID) {
  double best_ours = 1e300, best_twin = 1e300;
  for (auto _ : state) {
    double const a = time_of(ours.work, clock) / static_cast<double>(ours.n);
    double const b = time_of(twin.work, clock) / static_cast<double>(twin.n);
    best_ours = std::min(best_ours, a);
    best_twin = std::min(best_twin, b);
    state.SetIterationTime(a * static_cast<double>(ours.n));
  }
  state.counters["ours_ns"] = 1e9 * best_ours;
  state.counters["twin_ns"] = 1e9 * best_twin;
  state.counters["ratio"] = best_twin / best_ours;
  state.counters["wanted"] = wanted;
}

/// Ours alone: ns a sample.
template <class Ours>
void measure(benchmark::State& state, side<Ours> ours) {
  double best = 1e300;
  for (auto _ : state) {
    double const a = time_of(ours.work) / static_cast<double>(ours.n);
    best = std::min(best, a);
    state.SetIterationTime(a * static_cast<double>(ours.n));
  }
  state.counters["ours_ns"] = 1e9 * best;
}

/// A row that cannot be had here, and why.
inline void left_out(benchmark::State& state, char const* reason) {
  for (auto _ : state) state.SetIterationTime(1e-9);
  state.SetLabel(std::string("left out: ") + reason);
}

}  // namespace bench

/// A row that runs both sides so many times.
#define BENCH_ROW(FUNCTION, NAME, TIMES) BENCHMARK(FUNCTION)->Name(NAME)->UseManualTime()->Iterations(TIMES)->Unit(benchmark::kMillisecond)
