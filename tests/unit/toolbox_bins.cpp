// SPDX-License-Identifier: BSL-1.0
// The cells of many values at once are those of each value on its own.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <limits>
#include <vector>

#include <steelyard/core.hpp>

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

std::vector<double> values_around(sy::bins const& edges) {
  double const inf = std::numeric_limits<double>::infinity(), lower = edges.edge(0), upper = edges.edge(edges.size());
  std::vector<double> all{0.0, -0.0, 1e300, -1e300, std::numeric_limits<double>::max(), 1e-320};
#if !defined(__FAST_MATH__)
  all.insert(all.end(), {inf, -inf, std::numeric_limits<double>::quiet_NaN()});
#else
  static_cast<void>(inf);
#endif
  for (std::size_t b = 0; b <= edges.size(); ++b) {
    double const e = edges.edge(b);
    all.insert(all.end(), {e, std::nextafter(e, lower - 1.0), std::nextafter(e, upper + 1.0)});
  }
  sy::draws source(3);
  for (int i = 0; i < 2'000; ++i) all.push_back(source.uniform(lower - 0.2 * (upper - lower), upper + 0.2 * (upper - lower)));
  return all;
}

}  // namespace

TEST_CASE("bins: many values at once fall where each falls alone, for even, far-off, narrow and uneven bins") {
#if defined(__FAST_MATH__)
  double const narrowest = 1e-300;  // the processor takes subnormal numbers for zero
#else
  double const narrowest = 1e-310;
#endif
  for (sy::bins const& edges :
       {sy::equal_bins(0.0, 1.0, 100), sy::equal_bins(-3.7, 0.1, 7), sy::equal_bins(0.0, 1.0, 1), sy::equal_bins(1e9, 1e9 + 1.0, 1000),
        sy::equal_bins(1e15, 1e15 + 8.0, 64), sy::equal_bins(-1e300, 1e300, 10), sy::equal_bins(0.0, narrowest, 5),
        sy::equal_bins(0.0, 1.0, 200'000), sy::log_bins(1e-3, 1e3, 12), sy::bins({-1.0, 0.5, 0.75, 10.0})}) {
    CAPTURE(edges.edge(0));
    CAPTURE(edges.size());
    std::vector<double> const values = values_around(edges);
    std::vector<std::uint64_t> cells(values.size());
    edges.cells(values, cells.data());
    std::size_t differ = 0;
    for (std::size_t i = 0; i < values.size(); ++i)
      if (cells[i] != edges.cell(values[i])) ++differ;
    CHECK(differ == 0);
  }
}

TEST_CASE("bins: every vector width finds the same places") {
  sy::bins const edges = sy::equal_bins(-2.0, 3.0, 50);
  std::vector<double> const values = values_around(edges);
  detail::even_bins const even{-2.0, 10.0, 50.0, 1e-12};
  std::vector<std::uint64_t> plain(values.size()), same(values.size());
  detail::place_all(values, even, plain.data(), detail::isa::plain);
  for (detail::isa const width : {detail::isa::sse2, detail::isa::avx2, detail::isa::avx512}) {
    if (width > detail::widest_isa()) continue;
    detail::place_all(values, even, same.data(), width);
    CHECK(plain == same);
  }
}

TEST_CASE("histogram: some bins together are the event of falling in any of them, error bar and verdict too") {
  auto const edges = sy::equal_bins(-2.0, 2.0, 16);
  auto const itself = [](double x) { return x; };
  auto const middle = [](double x) { return x >= -0.5 && x < 1.0; };
  auto const far = [](double x) { return x >= 1.75 && x <= 2.0; };
  auto const read_one = [](double x) { return sy::log_likelihood{-0.5 * (x - 0.3) * (x - 0.3) / 0.04}; };
  std::vector<double> states(3'000);
  sy::draws source(11);
  for (double& each : states) each = source.normal();
  std::vector<std::uint32_t> labels(states.size());
  for (std::size_t i = 0; i < labels.size(); ++i) labels[i] = static_cast<std::uint32_t>(i % 20);
  for (bool const grouped : {false, true}) {
    CAPTURE(grouped);
    auto const sample = grouped ? sy::weigh(states, read_one, {.groups = labels}) : sy::weigh(states, read_one);
    auto const histogram = sample.histogram(itself, edges);
    auto const same = [](sy::estimate const& a, sy::estimate const& b) {
      CHECK(a.value == doctest::Approx(b.value).epsilon(1e-12));
      CHECK(a.standard_error == doctest::Approx(b.standard_error).epsilon(1e-9));
      CHECK(a.carriers == doctest::Approx(b.carriers).epsilon(1e-8));
      CHECK(a.verdict() == b.verdict());
      CHECK(a.never_seen() == b.never_seen());
    };
    same(histogram.probability(6, 12), sample.probability(middle));
    same(histogram.probability(15, 16), sample.probability(far));
    same(histogram.probability(15, 16), histogram.probability(15));
    // Their errors do not simply add: what is in one bin is not in the next.
    double squares = 0.0;
    for (std::size_t b = 0; b < 16; ++b) squares += std::pow(histogram.probability(b).standard_error, 2);
    CHECK(histogram.probability(0, 16).standard_error < 0.1 * std::sqrt(squares));
    CHECK_THROWS_WITH_AS(histogram.probability(3, 3),
                         "histogram: bins 3 up to 3 were asked for together; a range has at least one bin and ends by 16",
                         sy::bad_argument);
    CHECK_THROWS_AS(histogram.probability(3, 17), sy::bad_argument);
  }
}
