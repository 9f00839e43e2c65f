// SPDX-License-Identifier: BSL-1.0
// What a run costs a sample, question by question: one uniform number drawn and weighed and one question asked of it,
// beside a loop written by hand that draws, weighs and adds up what the answer and its error bar need.
#include <algorithm>
#include <array>
#include <cmath>
#include <random>
#include <string>
#include <vector>

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

/// Sums over w and w^2 of the products of x and y up to so many factors.
template <std::size_t First, std::size_t Second>
struct power_sums {
  std::array<double, (First + 1) * (First + 2) / 2> first{};
  std::array<double, (Second + 1) * (Second + 2) / 2> second{};
  template <std::size_t Degree, class To>
  static void add(To& to, double w, double x, double y) {
    std::size_t at = 0;
    double of_x = w;
    for (std::size_t a = 0; a <= Degree; ++a, of_x *= x) {
      double of_both = of_x;
      for (std::size_t b = 0; a + b <= Degree; ++b, of_both *= y) to[at++] += of_both;
    }
  }
  void operator()(double x, double y, double w) {
    add<First>(first, w, x, y);
    add<Second>(second, w * w, x, y);
  }
};
struct one_column {  // what a mean needs
  double s[5] = {};
  void operator()(double x, double, double w) {
    double const w2 = w * w;
    s[0] += w;
    s[1] += w2;
    s[2] += w * x;
    s[3] += w2 * x;
    s[4] += w2 * x * x;
  }
};
struct moment_powers {  // up to the fourth, and their errors
  double first[5] = {}, second[9] = {};
  void operator()(double x, double, double w) {
    double power = w, square = w * w;
    for (double& each : first) each += power, power *= x;
    for (double& each : second) each += square, square *= x;
  }
};
struct weights_alone {
  double sum = 0.0, squares = 0.0;
  void operator()(double, double, double w) { sum += w, squares += w * w; }
};
struct parts {
  double s[4] = {};
  void operator()(double x, double, double w) {
    std::size_t const in = x > 0.7 ? 0 : 2;
    s[in] += w;
    s[in + 1] += w * w;
  }
};
struct bars {
  std::array<std::array<double, 2>, 100> of{};
  void operator()(double x, double, double w) {
    auto& bar = of[std::min<std::size_t>(static_cast<std::size_t>(x * 100.0), 99)];
    bar[0] += w;
    bar[1] += w * w;
  }
};
struct steps {
  std::array<std::array<double, 2>, 5> of{};
  void operator()(double x, double, double w) {
    std::size_t const at = (x > 0.2 ? 1u : 0u) + (x > 0.4 ? 1u : 0u) + (x > 0.6 ? 1u : 0u) + (x > 0.8 ? 1u : 0u);
    of[at][0] += w;
    of[at][1] += w * w;
  }
};

template <class Sums>
void by_hand(std::size_t n, std::mt19937_64& engine, Sums sums) {
  std::uniform_real_distribution<double> uniform;
  for (std::size_t i = 0; i < n; ++i) {
    double const x = uniform(engine);
    sums(x, x * (1.0 - x), std::exp(-2.0 * (x - 0.4) * (x - 0.4)));
  }
  benchmark::DoNotOptimize(sums);
}

template <class Sums, class... Es>
void cost_of(char const* name, Sums sums, Es... questions) {
  auto const row = [sums, questions...](benchmark::State& state) {
    std::size_t const n = bench::samples(1'000'000);
    auto const pipe = sy::pipeline(draw, reading);
    std::mt19937_64 engine(1);
    bench::compare(state, 0.0, bench::side{n, [&] { benchmark::DoNotOptimize(pipe.estimate({.size = n}, questions...).drawn()); }},
                   bench::side{n, [&] { by_hand(n, engine, sums); }});
  };
  benchmark::RegisterBenchmark((std::string("a run with one question | ") + name).c_str(), row)
      ->UseManualTime()->Iterations(10)->Unit(benchmark::kMillisecond);
}

bool const registered = [] {
  cost_of("log_evidence", weights_alone{}, sy::log_evidence());
  cost_of("expectation", one_column{}, sy::expectation(itself));
  cost_of("probability", parts{}, sy::probability(is_high));
  cost_of("histogram, 100 bins", bars{}, sy::histogram(itself, sy::equal_bins(0.0, 1.0, 100)));
  cost_of("histogram, automatic bins", bars{}, sy::histogram(itself));
  cost_of("moments", moment_powers{}, sy::moments(itself));
  cost_of("ratio", power_sums<1, 2>{}, sy::ratio(itself, other));
  cost_of("difference", power_sums<1, 2>{}, sy::difference(itself, other));
  cost_of("covariance of two", power_sums<2, 4>{}, sy::covariance(both));
  cost_of("correlation", power_sums<2, 4>{}, sy::correlation(itself, other));
  cost_of("cumulative, 4 points", steps{}, sy::cumulative(itself, {0.2, 0.4, 0.6, 0.8}));
  return true;
}();

}  // namespace
