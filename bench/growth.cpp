// SPDX-License-Identifier: BSL-1.0
// Time per sample as samples grow: flat. 10^8 only where STEELYARD_BENCH_LARGE is set: it takes a minute and 2 GB.
#include <cstdlib>
#include <string>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace sy = steelyard;

namespace {

auto const draw = [](sy::draws& d) { return d.uniform(); };
auto const reading = [](double x) { return sy::log_likelihood{-2.0 * (x - 0.4) * (x - 0.4)}; };
auto const itself = [](double x) { return x; };

void one_pass(benchmark::State& state, std::size_t n) {
  auto const pipe = sy::pipeline(draw, reading);
  bench::measure(state, bench::side{n, [&] { benchmark::DoNotOptimize(pipe.expectation({.size = n}, itself).value); }});
}
void kept(benchmark::State& state, std::size_t n) {
  auto const pipe = sy::pipeline(draw, reading);
  bench::measure(state, bench::side{n, [&] { benchmark::DoNotOptimize(pipe.run({.size = n}).interval(itself, 0.9).lower.value); }});
}

bool const registered = [] {
  auto const rows = [](char const* of_size, std::size_t n, int times) {
    auto const row = [&](std::string const& what, void (*run)(benchmark::State&, std::size_t)) {
      benchmark::RegisterBenchmark((what + of_size).c_str(), [run, n](benchmark::State& state) { run(state, n); })
          ->UseManualTime()->Iterations(times)->Unit(benchmark::kMillisecond);
    };
    row("one pass, an expectation | ", one_pass);
    row("kept, an interval | ", kept);
  };
  rows("10^4 samples", 10'000, 200);
  if (bench::samples() < 1'000'000) return true;
  rows("10^6 samples", 1'000'000, 10);
  if (std::getenv("STEELYARD_BENCH_LARGE") != nullptr) rows("10^8 samples", 100'000'000, 1);
  return true;
}();

}  // namespace
