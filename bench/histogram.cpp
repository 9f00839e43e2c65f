// SPDX-License-Identifier: BSL-1.0
// Weighted histograms of 100 even bins with what their standard errors need.
#include <algorithm>
#include <cstdint>
#include <random>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

#if __has_include(<boost/histogram.hpp>)
#include <boost/histogram.hpp>
#endif
// GCC 12 takes the shape of an adapted vector, which has any number of dimensions, for one that is read past its end.
#if defined(__GNUC__) && !defined(__clang__)
#pragma GCC diagnostic ignored "-Warray-bounds"
#endif
#include <steelyard/array/xtensor.hpp>
#include <xtensor/xadapt.hpp>
#include <xtensor/xbuilder.hpp>
#include <xtensor/xhistogram.hpp>

namespace sy = steelyard;

namespace {

struct data {
  std::vector<double> values, weights;
  explicit data(std::size_t n) : values(n), weights(n) {
    std::mt19937_64 engine(4);
    std::normal_distribution<double> normal(0.5, 0.2);
    std::exponential_distribution<double> fall(1.0);
    for (double& each : values) each = normal(engine);
    for (double& each : weights) each = fall(engine);
  }
};
data const& all() {
  static data const made(bench::samples());
  return made;
}
double itself(double x) { return x; }

sy::histogram_result ours(std::size_t n) {
  auto sums = sy::histogram(itself, sy::equal_bins(0.0, 1.0, 100));
  sy::weighted_view view;
  view.values = std::span<double const>(all().values).first(n);
  view.weights = std::span<double const>(all().weights).first(n);
  sums.add(view.values, view.weights, view);
  sy::run_facts facts;
  facts.drawn = n;
  return sums.answer(facts);
}

void boost_histogram(benchmark::State& state) {
#if __has_include(<boost/histogram.hpp>)
  namespace bh = boost::histogram;
  std::size_t const n = all().values.size();
  bench::compare(state, 2.0, bench::side{n, [&] { benchmark::DoNotOptimize(ours(n).probability(50).standard_error); }},
                 bench::side{n, [&] {
                   auto h = bh::make_histogram_with(bh::weight_storage(), bh::axis::regular<>(100, 0.0, 1.0));
                   h.fill(all().values, bh::weight(all().weights));
                   benchmark::DoNotOptimize(h.at(50).variance());
                 }});
#else
  bench::left_out(state, "Boost.Histogram was not found");
#endif
}
BENCH_ROW(boost_histogram, "histogram of 100 even bins | Boost.Histogram, weighted storage", 15);

/// xt::histogram finds bins by an argsort where it is given edges, and directly where it is given the two ends; it has no
/// sums of squares, so no standard errors, either way.
template <class Bins>
void beside_xtensor(benchmark::State& state, double wanted, std::size_t few, Bins bins_of) {
  std::size_t const n = all().values.size();
  bench::compare(state, wanted, bench::side{n, [&] { benchmark::DoNotOptimize(ours(n).probability(50).standard_error); }},
                 bench::side{few, [&] {
                   xt::xtensor<double, 1> const h = bins_of();
                   benchmark::DoNotOptimize(h(50));
                 }});
}
xt::xtensor<double, 1> container(std::vector<double> const& from, std::size_t n) {
  xt::xtensor<double, 1> to = xt::xtensor<double, 1>::from_shape({n});
  std::copy_n(from.begin(), n, to.begin());
  return to;
}
void xtensor_adapted(benchmark::State& state) {
  std::size_t const n = all().values.size();
  xt::xtensor<double, 1> const edges = xt::linspace(0.0, 1.0, 101);
  auto values = all().values, weights = all().weights;
  std::vector<std::size_t> const shape{n};
  auto const x = xt::adapt(values, shape), w = xt::adapt(weights, shape);
  beside_xtensor(state, 500.0, n, [&] { return xt::histogram(x, edges, w); });
}
BENCH_ROW(xtensor_adapted, "histogram of 100 even bins | xt::histogram with edges, on adapted vectors", 1);
void xtensor_edges(benchmark::State& state) {
  std::size_t const few = bench::samples(1'000'000);
  xt::xtensor<double, 1> const edges = xt::linspace(0.0, 1.0, 101), x = container(all().values, few), w = container(all().weights, few);
  beside_xtensor(state, 0.0, few, [&] { return xt::histogram(x, edges, w); });
}
BENCH_ROW(xtensor_edges, "histogram of 100 even bins | xt::histogram with edges, on containers of its own, 1e6", 3);
void xtensor_ends(benchmark::State& state) {
  std::size_t const few = bench::samples(1'000'000);
  xt::xtensor<double, 1> const x = container(all().values, few), w = container(all().weights, few);
  beside_xtensor(state, 0.0, few, [&] { return xt::histogram(x, std::size_t{100}, w, 0.0, 1.0); });
}
BENCH_ROW(xtensor_ends, "histogram of 100 even bins | xt::histogram with two ends, sums alone, 1e6", 8);

}  // namespace
