// SPDX-License-Identifier: BSL-1.0
// What a run costs a sample, question by question: one uniform number drawn and weighed, and one question asked of it.
#include <array>
#include <string>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace sy = steelyard;

namespace {

auto const draw = [](sy::draws& d) { return d.uniform(); };
auto const reading = [](double x) { return sy::log_likelihood{-2.0 * (x - 0.4) * (x - 0.4)}; };
auto const itself = [](double x) { return x; };
auto const other = [](double x) { return x * (1.0 - x); };
auto const both = [](double x) { return std::array{x, x * (1.0 - x)}; };
auto const is_high = [](double x) { return x > 0.7; };

template <class... Es>
void cost_of(char const* name, Es... questions) {
  auto const row = [questions...](benchmark::State& state) {
    std::size_t const n = bench::samples(1'000'000);
    auto const pipe = sy::pipeline(draw, reading);
    bench::measure(state, bench::side{n, [&] { benchmark::DoNotOptimize(pipe.estimate({.size = n}, questions...).drawn()); }});
  };
  benchmark::RegisterBenchmark((std::string("a run with one question | ") + name).c_str(), row)
      ->UseManualTime()->Iterations(10)->Unit(benchmark::kMillisecond);
}

bool const registered = [] {
  cost_of("log_evidence", sy::log_evidence());
  cost_of("expectation", sy::expectation(itself));
  cost_of("probability", sy::probability(is_high));
  cost_of("histogram, 100 bins", sy::histogram(itself, sy::equal_bins(0.0, 1.0, 100)));
  cost_of("histogram, automatic bins", sy::histogram(itself));
  cost_of("moments", sy::moments(itself));
  cost_of("ratio", sy::ratio(itself, other));
  cost_of("covariance", sy::covariance(both));
  cost_of("correlation", sy::correlation(itself, other));
  cost_of("cumulative, 4 points", sy::cumulative(itself, {0.2, 0.4, 0.6, 0.8}));
  return true;
}();

}  // namespace
