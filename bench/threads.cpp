// SPDX-License-Identifier: BSL-1.0
// Two threads beside one, on a sampler of about a microsecond: by the clock on the wall, and the same bits.
#include <bit>
#include <cstdint>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace sy = steelyard;

namespace {

/// A chain of products and sums that no processor can shorten: about a microsecond.
auto const slow = [](sy::draws& d) {
  double x = d.uniform();
  for (int step = 0; step < 320; ++step) x = x * 0.9999 + 1e-5;
  return x;
};
auto const reading = [](double x) { return sy::log_likelihood{-x}; };
auto const itself = [](double x) { return x; };

void two_threads(benchmark::State& state) {
  std::size_t const n = bench::samples(200'000);
  auto const pipe = sy::pipeline(slow, reading);
  auto const on = [&](unsigned threads) { return pipe.expectation({.size = n, .threads = threads}, itself); };
  if (std::bit_cast<std::uint64_t>(on(1).value) != std::bit_cast<std::uint64_t>(on(2).value) ||
      std::bit_cast<std::uint64_t>(on(1).standard_error) != std::bit_cast<std::uint64_t>(on(2).standard_error))
    return state.SkipWithError("two threads gave other bits than one");
  bench::compare(state, 1.9, bench::side{n, [&] { benchmark::DoNotOptimize(on(2).value); }},
                 bench::side{n, [&] { benchmark::DoNotOptimize(on(1).value); }}, CLOCK_MONOTONIC);
}
BENCH_ROW(two_threads, "two threads | one thread, sampler of 1 us", 15);

}  // namespace
