// SPDX-License-Identifier: BSL-1.0
// Five questions in one pass, beside a loop written by hand; and what a uniform and a normal cost within a run.
#include <array>
#include <cmath>
#include <cstdint>
#include <random>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

auto const draw_uniform = [](sy::draws& d) { return d.uniform(); };
auto const draw_normal = [](sy::draws& d) { return d.normal(); };
auto const itself = [](double x) { return x; };
auto const square = [](double x) { return x * x; };
auto const is_high = [](double x) { return x > 0.7; };
auto const reading = [](double x) { return sy::log_likelihood{-2.0 * (x - 0.4) * (x - 0.4)}; };

/// The same five questions, with what their error bars need, on numbers in sequence; weights as they are.
struct by_hand {
  double w = 0.0, w2 = 0.0, in = 0.0, in2 = 0.0;
  std::array<double, 2> f{}, wf{}, wf2{};
  std::array<std::array<double, 2>, 20> bins{};

  template <class Next>
  void run(std::size_t n, Next next) {
    for (std::size_t i = 0; i < n; ++i) {
      double const x = next();
      double const v = std::exp(-2.0 * (x - 0.4) * (x - 0.4)), v2 = v * v;
      w += v;
      w2 += v2;
      double const y[2] = {x, x * x};
      for (std::size_t k = 0; k < 2; ++k) {
        f[k] += v * y[k];
        wf[k] += v2 * y[k];
        wf2[k] += v2 * y[k] * y[k];
      }
      if (x > 0.7) {
        in += v;
        in2 += v2;
      }
      auto& bin = bins[static_cast<std::size_t>(x * 20.0) % 20];
      bin[0] += v;
      bin[1] += v2;
    }
  }
};

void five_questions(benchmark::State& state) {
  std::size_t const n = bench::samples(4'000'000);
  auto const pipe = sy::pipeline(draw_uniform, reading);
  std::mt19937_64 engine(1);
  std::uniform_real_distribution<double> uniform;
  bench::compare(state, 1.0, bench::side{n, [&] {
                   auto const all = pipe.estimate({.size = n}, sy::expectation(itself), sy::expectation(square), sy::probability(is_high),
                                                  sy::histogram(itself, sy::equal_bins(0.0, 1.0, 20)), sy::log_evidence());
                   benchmark::DoNotOptimize(all.drawn());
                 }},
                 bench::side{n, [&] {
                   by_hand sums;
                   sums.run(n, [&] { return uniform(engine); });
                   benchmark::DoNotOptimize(sums);
                 }});
}
BENCH_ROW(five_questions, "five questions in one pass | loop on mt19937_64", 12);

/// Sum of one deviate a sample, each from its own stream, as a run makes them.
template <class Draw>
double sum_in_a_run(Draw const& draw, std::size_t n) {
  auto const weigh = [](double) { return sy::log_likelihood{0.0}; };
  detail::run_terms const terms{};
  detail::maker<Draw, decltype(weigh)> maker(draw, weigh, terms);
  double sum = 0.0;
  for (std::size_t first = 0; first < n; first += detail::block_size) {
    maker.expect(first, detail::block_size);
    for (std::size_t i = first; i < first + detail::block_size; ++i)
      maker.make(i, [&](double x, double, std::span<double const>) { sum += x; });
  }
  return sum;
}

template <class Distribution, class Draw>
void deviates(benchmark::State& state, double wanted, Draw const& draw) {
  std::size_t const n = bench::samples(4'000'000) / detail::block_size * detail::block_size + detail::block_size;
  std::mt19937_64 engine(1);
  bench::compare(state, wanted, bench::side{n, [&] {
                   double sum = sum_in_a_run(draw, n);
                   benchmark::DoNotOptimize(sum);
                 }},
                 bench::side{n, [&] {
                   Distribution standard;
                   double sum = 0.0;
                   for (std::size_t i = 0; i < n; ++i) sum += standard(engine);
                   benchmark::DoNotOptimize(sum);
                 }});
}

#if defined(__clang__)
constexpr double uniform_wanted = 5.0, normal_wanted = 5.0;
#else
constexpr double uniform_wanted = 1.0 / 1.1, normal_wanted = 1.3;
#endif
void uniforms(benchmark::State& state) { deviates<std::uniform_real_distribution<double>>(state, uniform_wanted, draw_uniform); }
void normals(benchmark::State& state) { deviates<std::normal_distribution<double>>(state, normal_wanted, draw_normal); }
BENCH_ROW(uniforms, "uniform() of its own stream, in a run | mt19937_64 and uniform_real_distribution", 20);
BENCH_ROW(normals, "normal() of its own stream, in a run | mt19937_64 and normal_distribution", 20);

}  // namespace
