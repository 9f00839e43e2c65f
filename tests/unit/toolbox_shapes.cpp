// SPDX-License-Identifier: BSL-1.0
// Shortest intervals, distribution functions, modes, histograms in two dimensions
// and automatic edges: against exhaustive search, published values and hand work.

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;
using law::holds;
using law::itself;
using law::said;

namespace {

sy::likelihood flat(double) { return sy::likelihood{1.0}; }

/// x = w = 1 .. 10.
auto ten() {
  std::vector<double> x;
  for (int i = 1; i <= 10; ++i) x.push_back(i);
  return sy::weigh(x, [](double w) { return sy::likelihood{w}; });
}

}  // namespace

TEST_CASE("shortest interval: exhaustive search over all pairs of values agrees") {
  for (std::uint64_t seed = 0; seed < 40; ++seed) {
    sy::draws draws(seed);
    std::size_t const n = 1 + static_cast<std::size_t>(draws.index(60));
    bool const lattice = draws.chance(0.5);
    std::vector<double> x, w;
    for (std::size_t i = 0; i < n; ++i) {
      x.push_back(lattice ? static_cast<double>(draws.index(12)) : draws.normal());
      w.push_back(draws.chance(0.2) ? 0.0 : static_cast<double>(draws.index(5)) + 1.0);
    }
    w[0] = 1.0;
    auto const sample = sy::weigh(x, flat, {.prior_weights = w});
    for (double const level : {0.05, 0.5, 0.68, 0.95, 0.999}) {
      CAPTURE(seed);
      CAPTURE(level);
      double total = 0.0;
      for (double const each : w) total += each;
      double width = 1e300, held = 0.0, low = 0.0, high = 0.0;
      for (std::size_t a = 0; a < n; ++a)
        for (std::size_t b = 0; b < n; ++b) {
          if (x[b] < x[a] || w[a] == 0.0 || w[b] == 0.0) continue;
          double inside = 0.0;
          for (std::size_t i = 0; i < n; ++i) inside += x[i] >= x[a] && x[i] <= x[b] ? w[i] : 0.0;
          if (inside < level * total - 1e-9) continue;
          double const here = x[b] - x[a];
          if (here < width || (here == width && (inside > held || (inside == held && x[a] < low)))) {
            width = here;
            held = inside;
            low = x[a];
            high = x[b];
          }
        }
      auto const found = sample.shortest_interval(itself, level);
      CHECK(found.lower.value == low);
      CHECK(found.upper.value == high);
      CHECK(found.width.value == width);
      sy::interval const plain = found;
      CHECK(plain.lower == low);
      CHECK(plain.upper_known);
    }
  }
}

TEST_CASE("shortest interval: never wider than the equal-tailed one, and the same law turned round") {
  std::vector<double> x, turned;
  for (std::size_t i = 0; i < 3000; ++i) {
    x.push_back(sy::draws(1, i).exponential(1.0));
    turned.push_back(-x.back());
  }
  auto const sample = sy::weigh(x, flat), other = sy::weigh(turned, flat);
  for (double const level : {0.3, 0.6827, 0.95}) {
    auto const a = sample.shortest_interval(itself, level), b = other.shortest_interval(itself, level);
    auto const tails = sample.interval(itself, level);
    CHECK(a.width.value <= tails.upper.value - tails.lower.value);
    CHECK(a.width.value == b.width.value);
    CHECK(a.lower.value == -b.upper.value);
    CHECK(a.lower.verdict() == sy::verdict::strained);  // its rate is not known
    CHECK(a.width.verdict() == sy::verdict::sound);
    CHECK(a.width.groups() == 16.0);
  }
}

TEST_CASE("shortest interval: few effective samples are strained, few groups make few parts") {
  std::vector<double> x;
  std::vector<std::uint32_t> groups;
  for (std::size_t i = 0; i < 600; ++i) {
    x.push_back(sy::draws(2, i).normal());
    groups.push_back(static_cast<std::uint32_t>(i % 4));
  }
  CHECK(sy::weigh(x, flat).shortest_interval(itself, 0.95).width.verdict() == sy::verdict::strained);
  CHECK(sy::weigh(x, flat).shortest_interval(itself, 0.5).width.verdict() == sy::verdict::sound);
  auto const four = sy::weigh(x, flat, {.groups = groups}).shortest_interval(itself, 0.5);
  CHECK(four.width.groups() == 4.0);
  CHECK(four.width.degrees_of_freedom == 3.0);
  CHECK(four.width.verdict() == sy::verdict::strained);
  auto const one = sy::weigh(std::vector<double>{2.0}, flat).shortest_interval(itself, 0.9);
  CHECK(one.lower.value == 2.0);
  CHECK(one.width.value == 0.0);
  CHECK(one.width.verdict() == sy::verdict::broken);
  for (double const bad : {0.0, 1.0, -0.5, 2.0})
    CHECK(holds(said<sy::bad_argument>([&] { (void)ten().shortest_interval(itself, bad); }), "is outside (0, 1)"));
}

TEST_CASE("distribution function: x = w = 1 .. 10") {
  // R quantile(rep(1:10, 1:10), type = 1): 0.1 0.25 0.5 0.75 0.9 -> 3 5 7 9 10; at the median F is 28/55 with standard
  // error 0.1792881826607 (Woodruff, JASA 47, 1952, 635).
  auto const f = ten().cumulative(itself);
  REQUIRE(f.size() == 10);
  for (std::size_t i = 0; i < 9; ++i) {
    double const x = static_cast<double>(i + 1);
    CHECK(f.value(i) == x);
    CHECK(f.step(i).value == doctest::Approx(x * (x + 1.0) / 110.0).epsilon(1e-14));
    CHECK(f.at(x + 0.5).value == f.step(i).value);
    CHECK(close(f.at(x), ten().probability([x](double v) { return v <= x; }), 1e-10));
  }
  // published for sum u^2 without the factor n/(n-1)
  CHECK(f.at(7.0).standard_error * std::sqrt(0.9) == doctest::Approx(0.1792881826607).epsilon(1e-12));
  double const orders[] = {0.1, 0.25, 0.5, 0.75, 0.9}, quantiles[] = {3.0, 5.0, 7.0, 9.0, 10.0};
  for (std::size_t k = 0; k < 5; ++k) CHECK(f.quantile(orders[k]).value == quantiles[k]);
  CHECK(f.at(0.0).never_seen());
  CHECK(f.at(10.0).always_seen());
  CHECK(f.at(0.99).error_interval(0.95).upper < 1.0);
  CHECK(holds(said<sy::bad_argument>([&] { f.step(10); }), "there is no step 10 among 10"));
  CHECK(holds(said<sy::bad_argument>([&] { f.value(10); }), "there is no step 10 among 10"));
  CHECK(holds(said<sy::bad_argument>([&] { f.at(law::not_a_number()); }), "a finite number is needed"));
  CHECK(holds(said<sy::bad_argument>([&] { f.quantile(1.0); }), "is outside (0, 1)"));
}

TEST_CASE("distribution function: chosen points, and what is refused") {
  static_assert(sy::estimator<sy::cumulative_points_estimator<double (*)(double)>>);
  auto const at = ten().cumulative(itself, {0.5, 1.0, 4.0, 4.5, 11.0});
  double const shares[] = {0.0, 1.0, 10.0, 10.0, 55.0};
  for (std::size_t j = 0; j < 5; ++j) CHECK(at.shares[j].value == doctest::Approx(shares[j] / 55.0).epsilon(1e-14));
  CHECK(at.points == std::vector<double>{0.5, 1.0, 4.0, 4.5, 11.0});
  CHECK(at.shares[0].never_seen());
  CHECK(at.shares[4].always_seen());
  CHECK(holds(said<sy::bad_argument>([] { (void)sy::cumulative(itself, {}); }), "at least one is needed"));
  CHECK(holds(said<sy::bad_argument>([] { (void)sy::cumulative(itself, {1.0, 1.0}); }), "point 1 is 1"));
  CHECK(holds(said<sy::bad_argument>([] {
                (void)sy::cumulative(itself, {0.0, law::not_a_number()});
              }),
              "rise strictly"));
}

TEST_CASE("mode: the bin of highest density, not of most weight") {
  // weights 1 .. 10 on 1 .. 10; bins of unequal width
  auto const m = ten().mode(itself, sy::bins({0.0, 5.0, 8.0, 9.5, 20.0}));
  // densities: (1+2+3+4)/5 = 2, (5+6+7)/3 = 6, (8+9)/1.5 = 11.3, 10/10.5 over 55
  CHECK(m.bin() == 2);
  CHECK(m.lower() == 8.0);
  CHECK(m.upper() == 9.5);
  CHECK(m.value() == 8.75);
  CHECK(m.density().value == doctest::Approx(17.0 / 1.5 / 55.0).epsilon(1e-14));
  CHECK(close(m.density(), ten().histogram(itself, sy::bins({0.0, 5.0, 8.0, 9.5, 20.0})).density(2), 1e-12));
  CHECK(m.rivals(0.95).size() >= 1);
  CHECK(m.rivals(0.999).size() >= m.rivals(0.5).size());
  CHECK(holds(said<sy::bad_argument>([&] { m.rivals(1.0); }), "outside (0, 1)"));
  // With many samples the true bin stands alone; on a flat law every bin is a rival.
  std::vector<double> triangle, even;
  for (std::size_t i = 0; i < 40'000; ++i) {
    sy::draws draws(5, i);
    triangle.push_back(draws.uniform() + draws.uniform());
    even.push_back(draws.uniform());
  }
  auto const peak = sy::weigh(triangle, flat).mode(itself, sy::equal_bins(0.0, 2.0, 5));
  CHECK(peak.bin() == 2);
  CHECK(peak.rivals(0.99).empty());
  CHECK(peak.error_interval(0.99).lower == 0.8);
  CHECK(peak.verdict() == sy::verdict::sound);
  auto const level = sy::weigh(even, flat).mode(itself, sy::equal_bins(0.0, 1.0, 8));
  CHECK(level.rivals(0.95).size() == 7);
  CHECK(level.error_interval(0.95).lower == 0.0);
  CHECK(level.error_interval(0.95).upper == 1.0);
  CHECK(holds(to_string(level), "7 more bins may be the highest"));
  CHECK(sy::weigh(even, flat).mode(itself, sy::equal_bins(3.0, 4.0, 2)).verdict() == sy::verdict::broken);
  CHECK(sy::weigh(even, flat).mode(itself, sy::equal_bins(0.0, 1.0, 1)).rivals(0.9).empty());
}

TEST_CASE("mode: groups carry its error") {
  std::vector<double> x;
  std::vector<std::uint32_t> groups;
  for (std::size_t i = 0; i < 4000; ++i) {  // twenty groups, each in one bin: nobody can tell the bins apart
    groups.push_back(static_cast<std::uint32_t>(i / 200));
    x.push_back(i / 200 < 8 ? 0.25 : i / 200 < 14 ? 0.75 : 1.25);
  }
  auto const bins = sy::equal_bins(0.0, 1.5, 3);
  auto const grouped = sy::weigh(x, flat, {.groups = groups}).mode(itself, bins),
             alone = sy::weigh(x, flat).mode(itself, bins);
  CHECK(alone.rivals(0.95).empty());
  CHECK(grouped.rivals(0.95).size() == 2);
  // u = 1{top} - 1{other} - lead over twenty equal groups, by hand: lead 8/20 - 6/20
  CHECK(grouped.density().standard_error == doctest::Approx(2.0 * std::sqrt(0.4 * 0.6 / 19.0)).epsilon(1e-10));
}

TEST_CASE("histogram in two dimensions: cells, edges and what lies outside") {
  // Edges closed left, open right, the last bin closed on both sides (numpy's rule), in each direction.
  struct point {
    double x, y;
  };
  std::vector<point> const points{{0.5, 0.5},  {1.5, 0.5}, {1.5, 1.0},  {2.0, 2.0},
                                  {-1.0, 0.5}, {0.5, 3.0}, {5.0, -5.0}, {0.5, law::not_a_number()}};
  std::vector<double> const w{1, 2, 3, 4, 5, 6, 7, 8};
  auto const sample = sy::weigh(points, [](point const&) { return sy::likelihood{1.0}; }, {.prior_weights = w});
  auto const h = sample.histogram_2d(&point::x, &point::y, sy::equal_bins(0.0, 2.0, 2), sy::bins({0.0, 1.0, 2.0}));
  CHECK(h.x_size() == 2);
  CHECK(h.y_size() == 2);
  CHECK(h.probability(0, 0).value == doctest::Approx(1.0 / 36.0));
  CHECK(h.probability(1, 0).value == doctest::Approx(2.0 / 36.0));
  CHECK(h.probability(1, 1).value == doctest::Approx(7.0 / 36.0));
  CHECK(h.probability(0, 1).never_seen());
  CHECK(h.density(1, 1).value == doctest::Approx(7.0 / 36.0));
  CHECK(h.x_below().value == doctest::Approx(5.0 / 36.0));
  CHECK(h.x_above().value == doctest::Approx(7.0 / 36.0));
  CHECK(h.y_below().value == doctest::Approx(7.0 / 36.0));
  CHECK(h.y_above().value == doctest::Approx(6.0 / 36.0));
  CHECK(h.not_a_number().value == doctest::Approx(8.0 / 36.0));
  CHECK(h.outside().value == doctest::Approx(26.0 / 36.0));
  // se^2 = n/(n-1) sum W^2 (1 - p)^2
  double squares = 0.0;
  for (std::size_t i = 0; i < 8; ++i)
    squares += std::pow(w[i] / 36.0 * ((i == 2 || i == 3 ? 1.0 : 0.0) - 7.0 / 36.0), 2);
  CHECK(h.probability(1, 1).standard_error == doctest::Approx(std::sqrt(squares * 8.0 / 7.0)).epsilon(1e-12));
  CHECK(h.x_edges_chosen() == sy::edge_choice::given);
  CHECK(holds(to_string(h), "outside: 0.72"));
  CHECK(holds(said<sy::bad_argument>([&] { (void)h.probability(2, 0); }), "there is no cell (2, 0) among 2 by 2"));
}

TEST_CASE("histogram in two dimensions: groups, in one walk, as each cell asked alone") {
  std::vector<double> x, w;
  std::vector<std::uint32_t> groups;
  for (std::size_t i = 0; i < 3000; ++i) {
    sy::draws draws(6, i);
    x.push_back(draws.normal());
    w.push_back(draws.exponential(1.0));
    groups.push_back(static_cast<std::uint32_t>(draws.index(25)));
  }
  auto const second = [](double v) { return std::abs(v) - 1.0; };
  auto const sample = sy::weigh(x, flat, {.prior_weights = w, .groups = groups});
  auto const h = sample.histogram_2d(itself, second, sy::equal_bins(-2.0, 1.0, 6), sy::equal_bins(-1.0, 0.5, 4));
  for (std::size_t i = 0; i < 6; ++i)
    for (std::size_t j = 0; j < 4; ++j) {
      auto const alone = sample.probability([&](double v) {
        return v >= h.x_edge(i) && v < h.x_edge(i + 1) && second(v) >= h.y_edge(j) && second(v) < h.y_edge(j + 1);
      });
      CAPTURE(i);
      CAPTURE(j);
      CHECK(close(h.probability(i, j), alone, 1e-10));
    }
  CHECK(close(h.x_above(), sample.probability([](double v) { return v > 1.0; }), 1e-10));
}

TEST_CASE("automatic edges: Freedman & Diaconis on the effective size, from quantile 0.001 to 0.999") {
  // Exact quantiles of N(0, 1), equal weights: IQR 1.3489795, range 2 * 3.0902323.
  std::vector<double> normal, w;
  for (int i = 0; i < 4000; ++i) {
    normal.push_back(sy::detail::normal_quantile((i + 0.5) / 4000.0));
    w.push_back(i % 2 == 0 ? 1.0 : 0.0);
  }
  auto const h = sy::weigh(normal, flat).histogram(itself);
  double const width = 2.0 * 1.3489795 / std::cbrt(4000.0);
  CHECK(h.edge(0) == doctest::Approx(-3.0902323).epsilon(2e-2));
  CHECK(h.edge(h.size()) == doctest::Approx(3.0902323).epsilon(2e-2));
  CHECK(std::abs(static_cast<double>(h.size()) - 6.1804646 / width) < 1.5);
  CHECK(h.edges_chosen() == sy::edge_choice::spread);
  // Half the effective size: wider bins by the cube root of two.
  auto const half = sy::weigh(normal, flat, {.prior_weights = w}).histogram(itself);
  CHECK(std::abs(static_cast<double>(half.size()) - 6.1804646 / width / std::cbrt(2.0)) < 1.5);
  // In two dimensions the width goes with n^(-1/4).
  auto const both = sy::weigh(normal, flat).histogram_2d(itself, [](double x) { return 10.0 * x; });
  CHECK(std::abs(static_cast<double>(both.x_size()) - 6.1804646 / (2.0 * 1.3489795) * std::pow(4000.0, 0.25)) < 1.5);
  CHECK(both.x_size() == both.y_size());
  CHECK(both.y_edge(0) == doctest::Approx(10.0 * both.x_edge(0)));
  CHECK(both.y_edges_chosen() == sy::edge_choice::spread);
}

TEST_CASE("automatic edges: 5 to 200 bins, and a zero spread falls back to the range") {
  std::vector<double> few{0.0, 1.0, 2.0, 3.0}, wild, spike, nearly, same(500, 3.0);
  for (int i = 0; i < 4000; ++i) {
    wild.push_back(i < 3900 ? 1e-3 * i / 3900.0 : 1e3 * (i - 3899.0));
    spike.push_back(i < 3600 ? 1.0 : i % 2 == 0 ? 0.0 : 4.0);
    nearly.push_back(i == 17 ? 9.0 : 2.0);
  }
  CHECK(sy::weigh(few, flat).histogram(itself).size() == 5);
  CHECK(sy::weigh(wild, flat).histogram(itself).size() == 200);
  auto const range = sy::weigh(spike, flat).histogram(itself);
  CHECK(range.edges_chosen() == sy::edge_choice::range);
  CHECK(range.edge(0) == 0.0);
  CHECK(range.edge(range.size()) == 4.0);
  CHECK(range.size() == static_cast<std::size_t>(std::ceil(6.1804646 / (2.0 * 1.3489795) * std::cbrt(4000.0))));
  CHECK(holds(to_string(range), "The quartiles coincide"));
  auto const all = sy::weigh(nearly, flat).histogram(itself);  // quantiles 0.001 and 0.999 coincide as well
  CHECK(all.edges_chosen() == sy::edge_choice::range);
  CHECK(all.edge(0) == 2.0);
  CHECK(all.edge(all.size()) == 9.0);
  auto const point = sy::weigh(same, flat).histogram(itself);
  CHECK(point.edges_chosen() == sy::edge_choice::point);
  CHECK(point.edge(0) == 2.5);
  CHECK(point.edge(5) == 3.5);
  CHECK(sy::weigh(same, flat).histogram(itself, sy::equal_bins(0.0, 4.0, 4)).edges_chosen() == sy::edge_choice::given);
}

TEST_CASE("histogram: its mode is the question's") {
  auto const h = ten().histogram(itself, sy::equal_bins(0.0, 12.0, 4));
  CHECK(h.mode().bin() == ten().mode(itself, sy::equal_bins(0.0, 12.0, 4)).bin());
  CHECK(h.mode().density().value == h.density(h.mode().bin()).value);
}
