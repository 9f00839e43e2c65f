// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/estimate/bins.hpp>

#include <cmath>
#include <cstddef>
#include <limits>
#include <vector>

// Edges belong to the bin above them, the last one to the last bin: numpy's rule.

namespace sy = steelyard;

TEST_CASE("edges: a value on an edge falls into the bin above it, on the last edge into the last bin") {
  double const inf = std::numeric_limits<double>::infinity();
  auto const just_below = [inf](double x) {
#if defined(__FAST_MATH__)
    if (x == 0.0) return -std::numeric_limits<double>::min();  // the processor takes what is smaller for zero
#endif
    return std::nextafter(x, -inf);
  };
  for (sy::bins const& edges : {sy::bins({-1.0, 0.0, 1.0, 2.5, 3.0}), sy::equal_bins(0.0, 4.0, 4),
                                sy::equal_bins(-0.3, 0.7, 10), sy::log_bins(0.01, 100.0, 8)}) {
    std::size_t const n = edges.size();
    CAPTURE(n);
    std::vector<double> values{just_below(edges.edge(0)), std::nextafter(edges.edge(n), inf), std::nan("")};
    std::vector<std::size_t> expected{n, n + 1, n + 2};
    for (std::size_t b = 0; b <= n; ++b) {
      values.push_back(edges.edge(b));
      expected.push_back(b < n ? b : n - 1);
      if (b == 0) continue;
      values.push_back(just_below(edges.edge(b)));
      expected.push_back(b - 1);
    }
    for (std::size_t i = 0; i < values.size(); ++i) {
      CAPTURE(values[i]);
      CHECK(edges.cell(values[i]) == expected[i]);
    }
  }
}
