// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Low probabilities beside exact ones, from the sampler alone and given a reading.

#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <stdexcept>
#include <stop_token>
#include <string>
#include <vector>

#include <steelyard/tempered.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::said;

namespace {

using point = std::vector<double>;

/// d normal deviates.
struct normals {
  std::size_t d;
  point operator()(sy::draws& draws) const {
    point x(d);
    for (double& v : x) v = draws.normal();
    return x;
  }
};
/// Linear limit state: P = Phi(-beta) in any dimension.
struct sum_over {
  double beta;
  double operator()(point const& x) const {
    double sum = 0.0;
    for (double const v : x) sum += v;
    return sum / std::sqrt(static_cast<double>(x.size())) - beta;
  }
};
/// Outside a sphere.
struct outside {
  double r2;
  double operator()(point const& x) const {
    double sum = 0.0;
    for (double const v : x) sum += v * v;
    return sum - r2;
  }
};

double upper(double z) { return 0.5 * std::erfc(z / std::sqrt(2.0)); }

template <class Result>
void agrees(Result const& p, double exact) {
  CAPTURE(p.value);
  CAPTURE(p.standard_error);
  // Deep levels leave few lineages, and then the verdict says so.
  CHECK(p.verdict() == (p.diagnosis().lineages() < 20.0 ? sy::verdict::strained : sy::verdict::sound));
  CHECK(std::abs(p.value - exact) <= 5.0 * p.standard_error);
  sy::interval const where = p.error_interval(0.999999);
  CHECK(where.lower > 0.0);
  CHECK(where.lower < exact);
  CHECK(exact < where.upper);
}

bool finds(sy::diagnosis const& health, sy::finding_kind kind, std::string const& words) {
  for (sy::finding const& each : health.findings())
    if (each.kind == kind && each.text.find(words) != std::string::npos) return true;
  return false;
}

/// Square of the coefficient of variation that as many uncorrelated particles would leave, levels at p0: the floor.
///   (1 - p0)/(p0 N) a level                                    [Au & Beck, Prob. Eng. Mech. 16, 2001]
double floor_square(double p, double p0, double particles) { return std::log(p) / std::log(p0) * (1.0 - p0) / (p0 * particles); }

}  // namespace

TEST_CASE("a linear limit state in 2, 20 and 200 dimensions") {
  for (std::size_t const d : {2u, 20u, 200u}) {
    CAPTURE(d);
    sy::tempered_plan const how{.seed = 1, .chains = d < 200 ? 200u : 50u};
    if (d < 200) agrees(sy::low_probability(normals{d}, sum_over{3.5}, how), 2.3262907903552504e-4);
    agrees(sy::low_probability(normals{d}, sum_over{5.0}, how), 2.8665157187919391e-7);
  }
  agrees(sy::low_probability(normals{2}, sum_over{6.0}, {.seed = 1}), 9.865876450376981e-10);
  agrees(sy::low_probability(normals{1}, sum_over{8.0}, {.seed = 1}), 6.2209605742717841e-16);
}

TEST_CASE("with chains enough, a low probability is sound") {
  CHECK(sy::low_probability(normals{2}, sum_over{5.0}, {.seed = 1, .chains = 400}).verdict() == sy::verdict::sound);
}

TEST_CASE("outside a sphere, and a series system of four branches") {
  agrees(sy::low_probability(normals{2}, outside{25.0}, {.seed = 1}), 3.72665317207867e-6);
  agrees(sy::low_probability(normals{10}, outside{50.0}, {.seed = 1}), 2.66908342490450e-7);
  // Waarts 2000, k = 6, by quadrature.
  auto const series = [](point const& x) {
    double const u = (x[0] + x[1]) / std::sqrt(2.0), v = x[0] - x[1];
    double const bent = 3.0 + 0.1 * v * v - std::abs(u), straight = 6.0 / std::sqrt(2.0) - std::abs(v);
    return -(bent < straight ? bent : straight);
  };
  agrees(sy::low_probability(normals{2}, series, {.seed = 1}), 0.004457331490626);
}

TEST_CASE("a standard error is never below what uncorrelated particles would leave") {
  // Ten levels of a tenth, 1000 to a level and Phi(-6): 0.28463.
  double const published = std::sqrt(floor_square(upper(6.0), 0.1, 1000.0));
  CHECK(published == doctest::Approx(0.28463).epsilon(0.005));
  for (std::uint64_t seed = 1; seed <= 5; ++seed) {
    CAPTURE(seed);
    // 50 chains of 20 states: 1000 particles.
    auto const p =
        sy::low_probability(normals{2}, sum_over{6.0}, {.seed = seed, .chains = 50, .draws = 1000, .longest = 20, .level_share = 0.1});
    CHECK(p.value > 0.0);
    CHECK(p.standard_error / p.value >= 0.97 * published);  // levels keep a tenth to within one particle in 1000
  }
  // Where the influence of lineages adds up to less than that, the floor counts.
  auto const terms = sy::detail::level_terms({1e-6, -1e-6}, 0.5, 0.01, 1.0);
  CHECK(terms.sum_squares == doctest::Approx(0.25 * 0.01));
  CHECK(terms.sum_squares * terms.sum_squares / terms.sum_fourth == doctest::Approx(2.0));
}

TEST_CASE("given a reading: the reading first, then the levels") {
  // x0 read as 1 with standard deviation s; x0 + x1 above 6 given that.
  double const s = 0.1;
  auto const reading = [s](point const& x) {
    double const z = (1.0 - x[0]) / s;
    return sy::log_likelihood{-0.5 * z * z};
  };
  auto const over = [](point const& x) { return x[0] + x[1] - 6.0; };
  sy::pipeline const pipe{normals{2}, reading};
  double const mean = 1.0 / (1.0 + s * s), variance = s * s / (1.0 + s * s);
  double const exact = upper((6.0 - mean) / std::sqrt(variance + 1.0));
  auto const p = sy::low_probability(pipe, over, {.seed = 1});
  agrees(p, exact);
  for (double const margin : p.sample().values(over)) CHECK(margin > 0.0);
  // The states are those of reading and event together, and so is their evidence.
  auto const z = p.sample().log_evidence();
  double const log_reading = 0.5 * (std::log(variance) - 1.0 / (1.0 + s * s));
  CHECK(std::abs(z.value - (log_reading + std::log(exact))) <= 5.0 * z.standard_error);
  // Where x0 goes, given both: normal regression on the sum, near its edge.
  auto const x0 = p.sample().expectation([](point const& x) { return x[0]; });
  double const a = (6.0 - mean) / std::sqrt(variance + 1.0), hazard = std::exp(-0.5 * a * a) / std::sqrt(2.0 * 3.14159265358979324) / exact;
  CHECK(std::abs(x0.value - (mean + variance / std::sqrt(variance + 1.0) * hazard)) <= 5.0 * x0.standard_error);
}

TEST_CASE("states in which it happens, for a look at them") {
  auto const p = sy::low_probability(normals{2}, sum_over{5.0}, {.seed = 1});
  auto const ten = p.sample().resample(10);
  CHECK(ten.size() == 10);
  for (point const& x : ten) CHECK(sum_over{5.0}(x) > 0.0);
  CHECK(p.levels() >= 8);
  CHECK(p.sampler_calls() > 10'000);
  CHECK(std::abs(p.sample().log_evidence().value - std::log(p.value)) < 1e-9);
}

TEST_CASE("margins of few values and many ties") {
  // How many of 20 words lie above 0.9; at least 9.
  auto const count = [](sy::draws& draws) {
    int n = 0;
    for (int i = 0; i < 20; ++i) n += draws.uniform() > 0.9 ? 1 : 0;
    return n;
  };
  double exact = 0.0;
  for (int k = 9; k <= 20; ++k)
    exact += std::exp(std::lgamma(21.0) - std::lgamma(k + 1.0) - std::lgamma(21.0 - k) + k * std::log(0.1) + (20 - k) * std::log(0.9));
  auto const p = sy::low_probability(count, [](int n) { return n - 8.5; }, {.seed = 1, .longest = 100});
  agrees(p, exact);
  // Zero itself is not above zero.
  auto const strict = sy::low_probability(count, [](int n) { return static_cast<double>(n - 8); }, {.seed = 1, .longest = 100});
  agrees(strict, exact);
  // All alike: one rung at most, not rungs without end.
  auto const flat = sy::low_probability(count, [](int) { return -1.0; }, {.seed = 1});
  CHECK(flat.never_seen());
  CHECK(flat.levels() <= 1);
}

TEST_CASE("an event that every draw meets, or nearly, and one that cannot be") {
  auto const always = sy::low_probability(normals{2}, [](point const&) { return 1.0; }, {.seed = 1});
  CHECK(always.value == 1.0);
  auto const half = sy::low_probability(normals{2}, sum_over{0.0}, {.seed = 1});
  agrees(half, 0.5);
  CHECK(half.levels() == 1);

  auto const never = sy::low_probability(normals{1}, [](point const& x) { return -1.0 - x[0] * x[0]; }, {.seed = 1, .chains = 50, .longest = 40});
  CHECK(never.value == 0.0);
  CHECK(never.never_seen());
  CHECK(never.verdict() == sy::verdict::broken);
  CHECK(never.error_interval(0.95).upper < 1e-3);
  CHECK(finds(never.diagnosis(), sy::finding_kind::target_missed, "Check the margin and its sign"));
  CHECK(said<sy::not_kept>([&] { (void)never.sample(); }).find("no state with a margin above zero was found") != std::string::npos);
}

TEST_CASE("a single lineage left: an error bar of the floor, no interval, and broken") {
  // A Poisson number of exponential sizes with their sum read sharply: few chains do not mix, and end in one lineage.
  auto const sampler = [](sy::draws& draws) {
    double left = 3.0;
    point x{0.0};
    while ((left += std::log(draws.uniform())) > 0.0) {
      x.push_back(draws.exponential(1.0));
      x[0] += x.back();
    }
    return x;
  };
  auto const reading = [](point const& x) { return sy::log_likelihood{-1250.0 * (4.0 - x[0]) * (4.0 - x[0])}; };
  auto const p = sy::low_probability(sy::pipeline{sampler, reading}, [](point const& x) { return static_cast<double>(x.size()) - 7.5; },
                                     {.seed = 1, .chains = 40, .draws = 500, .shortest = 10, .longest = 10});
  REQUIRE(p.diagnosis().lineages() == 1.0);
  CHECK(p.verdict() == sy::verdict::broken);
  CHECK(p.standard_error > 0.0);
  CHECK(p.standard_error < 1.0);
  CHECK(!p.error_interval(0.95).lower_known);
}

TEST_CASE("levels: the same bits on two threads, frozen levels, a stop, and what is refused") {
  sy::tempered_plan how{.seed = 1, .chains = 50, .draws = 1000};
  auto const one = sy::low_probability(normals{2}, sum_over{4.0}, how);
  how.threads = 2;
  auto const two = sy::low_probability(normals{2}, sum_over{4.0}, how);
  CHECK(law::bits(static_cast<sy::estimate const&>(one)) == law::bits(static_cast<sy::estimate const&>(two)));
  CHECK(one.sample().values(sum_over{4.0}) == two.sample().values(sum_over{4.0}));

  sy::tempered_plan frozen{.seed = 1};
  frozen.frozen = true;
  auto const again = sy::low_probability(normals{2}, sum_over{4.0}, frozen);
  agrees(again, upper(4.0));

  how.threads = 1;
  std::stop_source source;
  how.token = source.get_token();
  how.progress = [&](sy::progress_report const&) { source.request_stop(); };
  auto const stopped = sy::low_probability(normals{2}, sum_over{4.0}, how);
  CHECK(stopped.value == 0.0);
  CHECK(finds(stopped.diagnosis(), sy::finding_kind::stopped, "less probable than that"));

  double const nan = std::numeric_limits<double>::quiet_NaN();
  auto const refused = [](auto const& margin) {
    std::string const text = said<sy::failed_sample>([&] { sy::low_probability(normals{2}, margin, {.seed = 1}); });
    CAPTURE(text);
    CHECK(text.find("low_probability: the margin in draw 0 failed") == 0);
    CHECK(text.find('\n') == std::string::npos);
  };
  refused([nan](point const&) { return nan; });
  refused([](point const&) { return -INFINITY; });
  refused([](point const&) -> double { throw std::runtime_error("no tide"); });
  CHECK(said<sy::bad_argument>([] { sy::low_probability(normals{2}, sum_over{1.0}, {.level_share = 1.0}); })
            .find("low_probability: the plan's level_share is 1") == 0);
}
