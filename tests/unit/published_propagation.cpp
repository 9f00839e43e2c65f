// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Propagation with all weights equal: with no reading, the library is plain Monte
// Carlo propagation, as in JCGM 101:2008 (GUM Supplement 1), clause 9.
// Compared with exact values beside the published ones, within 5 reported standard errors.

#include <doctest/doctest.h>

#include <cmath>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::errors_off;

namespace {

sy::likelihood no_reading(double) { return sy::likelihood{1.0}; }
double const root_three = std::sqrt(3.0);

template <class Sampler>
auto propagate(Sampler sampler, std::uint64_t seed) {
  return sy::pipeline{sampler, no_reading}.run({.size = 200'000, .seed = seed});
}

}  // namespace

TEST_CASE("JCGM 101:2008, 9.2: sums of four quantities") {
  struct known {
    double u, half_width;
  };
  auto const check = [](auto const& sample, known const& exact) {
    auto const mean = sample.expectation(law::itself);
    CHECK(errors_off(mean, 0.0) < 5.0);
    CHECK(law::close(mean.effective_size, 200'000.0));
    CHECK(law::close(mean.standard_error * std::sqrt(200'000.0), exact.u, 0.02));
    auto const [u, moments] = sample.estimate(law::spread(law::itself), sy::moments(law::itself));
    CHECK(errors_off(u, exact.u) < 5.0);
    CHECK(errors_off(moments.sd, exact.u) < 5.0);
    auto const interval = sample.interval(law::itself, 0.95);
    CHECK(errors_off(interval.lower, -exact.half_width) < 5.0);
    CHECK(errors_off(interval.upper, exact.half_width) < 5.0);
    CHECK(interval.upper.standard_error < 0.01 * exact.half_width);
    CHECK(sample.log_evidence().value == 0.0);
  };
  // 9.2.2: four N(0, 1); published 0.00, 2.00, +-3.92; exact 2 z(0.975).
  check(propagate([](sy::draws& d) { return d.normal() + d.normal() + d.normal() + d.normal(); }, 1),
        {2.0, 3.919927969080108});
  // 9.2.3: four rectangular on (-sqrt 3, sqrt 3); published 0.00, 2.00, +-3.88.
  auto const rectangular = [](sy::draws& d) { return d.uniform(-root_three, root_three); };
  check(propagate([=](sy::draws& d) { return rectangular(d) + rectangular(d) + rectangular(d) + rectangular(d); }, 2),
        {2.0, 3.879406741347821});
  // 9.2.4: three rectangular of sd 1 and one of sd 10; published 0.0, 10.1, +-17.0.
  check(propagate([=](sy::draws& d) { return rectangular(d) + rectangular(d) + rectangular(d) + 10.0 * rectangular(d); }, 3),
        {std::sqrt(103.0), 17.015814099869594});
}

TEST_CASE("JCGM 101:2008, 9.4: comparison loss in microwave power meter calibration, units of 1e-6") {
  // Y = X1^2 + X2^2, X1 ~ N(x1, 0.005), X2 ~ N(0, 0.005), uncorrelated. Exact: noncentral chi-square with 2 degrees.
  struct known {
    double x1, mean, u, shortest_low, shortest_high, low, high;
  };
  // Published from memory: 50, 50, [0, 150]; 150, 112, [0, 367]; 2551, 502, [1591, 3543].
  known const cases[] = {{0.0, 50.0, 50.0, 0.0, 149.78661367769953, 1.2659, 184.4440},
                         {0.010, 150.0, 111.8034, 0.0, 366.0053, 8.5468, 427.1233},
                         {0.050, 2550.0, 502.4938, 1593.5697, 3548.5698, 1638.4771, 3603.3581}};
  std::uint64_t seed = 0;
  for (known const& exact : cases) {
    CAPTURE(exact.x1);
    auto const sample = propagate(
        [x1 = exact.x1](sy::draws& d) {
          double const a = d.normal(x1, 0.005), b = d.normal(0.0, 0.005);
          return 1e6 * (a * a + b * b);
        },
        ++seed);
    auto const moments = sample.moments(law::itself);
    CHECK(errors_off(moments.mean, exact.mean) < 5.0);
    CHECK(errors_off(moments.sd, exact.u) < 5.0);
    auto const tails = sample.interval(law::itself, 0.95);
    CHECK(errors_off(tails.lower, exact.low) < 5.0);
    CHECK(errors_off(tails.upper, exact.high) < 5.0);
    // The width of the shortest interval is held tightly, its ends loosely: they settle as n^(-1/3).
    auto const shortest = sample.shortest_interval(law::itself, 0.95);
    double const width = exact.shortest_high - exact.shortest_low;
    CHECK(std::abs(shortest.width.value - width) < 0.01 * width);
    CHECK(errors_off(shortest.width, width) < 5.0);
    CHECK(std::abs(shortest.lower.value - exact.shortest_low) < 0.04 * width);
    CHECK(std::abs(shortest.upper.value - exact.shortest_high) < 0.04 * width);
    CHECK(shortest.width.value <= tails.upper.value - tails.lower.value);
  }
}

TEST_CASE("y = ln x, x rectangular on (0.1, 1.1): mean, sd and shortest 95 % interval in closed form") {
  auto const sample = propagate([](sy::draws& d) { return std::log(d.uniform(0.1, 1.1)); }, 1);
  auto const moments = sample.moments(law::itself);
  CHECK(errors_off(moments.mean, -0.664900292916) < 5.0);
  CHECK(errors_off(moments.sd, 0.606226697429) < 5.0);
  auto const shortest = sample.shortest_interval(law::itself, 0.95);
  double const width = 0.0953101798043 + 1.89711998489;
  CHECK(std::abs(shortest.width.value - width) < 0.01 * width);
  CHECK(std::abs(shortest.lower.value + 1.89711998489) < 0.02 * width);
  CHECK(std::abs(shortest.upper.value - 0.0953101798043) < 0.02 * width);
}
