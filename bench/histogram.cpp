// SPDX-License-Identifier: BSL-1.0
// Weighted histograms of 100 even bins with what their standard errors need.
#include <array>
#include <cstdint>
#include <random>
#include <vector>

#include <steelyard/core.hpp>

#include "support/compare.hpp"

#if __has_include(<boost/histogram.hpp>)
#include <boost/histogram.hpp>
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
  std::array<std::size_t, 1> const shape{few};
  auto const values = xt::adapt(all().values.data(), few, xt::no_ownership(), shape);
  auto const weights = xt::adapt(all().weights.data(), few, xt::no_ownership(), shape);
  bench::compare(state, wanted, bench::side{n, [&] { benchmark::DoNotOptimize(ours(n).probability(50).standard_error); }},
                 bench::side{few, [&] {
                   xt::xtensor<double, 1> const h = bins_of(values, weights);
                   benchmark::DoNotOptimize(h(50));
                 }});
}
void xtensor_edges(benchmark::State& state) {
  xt::xtensor<double, 1> const edges = xt::linspace(0.0, 1.0, 101);
  beside_xtensor(state, 500.0, bench::samples(1'000'000),
                 [&](auto const& values, auto const& weights) { return xt::histogram(values, edges, weights); });
}
BENCH_ROW(xtensor_edges, "histogram of 100 even bins | xt::histogram with edges", 3);
void xtensor_ends(benchmark::State& state) {
  beside_xtensor(state, 1.0, all().values.size(), [](auto const& values, auto const& weights) {
    return xt::histogram(values, std::size_t{100}, weights, 0.0, 1.0);
  });
}
BENCH_ROW(xtensor_ends, "histogram of 100 even bins | xt::histogram with two ends, sums alone", 8);

}  // namespace
