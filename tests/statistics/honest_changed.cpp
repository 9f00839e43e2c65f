// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <functional>
#include <string>
#include <utility>
#include <vector>

#include "statistics/cells.hpp"
#include "statistics/exact.hpp"
#include "statistics/problems.hpp"
#include "statistics/sources.hpp"

// Error bars of samples that were changed after they were drawn: readings taken away or replaced, an event given, more
// samples drawn; and of answers in one pass. One line a cell, and one rule for all.

namespace {

using namespace known;
using sample_t = sy::weighted_sample<point>;

/// A level read twice: N(0, 1), read as 0.8 with sd 0.6 and as 1.4 with sd 0.5.
auto two_readings() {
  return sy::pipeline{normal_prior(0, 1), sy::together(sy::named("gauge", normal_reading(0.8, 0.6)),
                                                       sy::named("float", normal_reading(1.4, 0.5)))};
}

/// N(0, 1) given readings with their sds.
posterior given(std::vector<std::pair<double, double>> const& readings) {
  double precision = 1.0, sum = 0.0, log_evidence = 0.0, mean = 0.0, variance = 1.0;
  for (auto const& [y, sd] : readings) {
    log_evidence += log_normal_density(y, mean, std::sqrt(variance + sd * sd));
    precision += 1.0 / (sd * sd);
    sum += y / (sd * sd);
    variance = 1.0 / precision;
    mean = sum * variance;
  }
  return normal(mean, std::sqrt(variance), log_evidence);
}

struct change {
  std::string name;
  std::function<sample_t(std::uint64_t seed, std::size_t size)> sample;
  posterior exact;
};

std::vector<change> changes() {
  auto const pipe = two_readings();
  auto const run = [=](std::uint64_t seed, std::size_t size) { return pipe.run({.size = size, .seed = seed}); };
  auto const streams = [=](std::uint64_t seed, std::size_t size) {
    return pipe.run({.size = size, .seed = seed, .keep = sy::keeping::streams});
  };
  auto const positive = [](point const& p) { return p.x > 0.5; };
  auto const both = [](double x) { return log_normal_density(0.8, x, 0.6) + log_normal_density(1.4, x, 0.5); };
  auto const one = [](double x) { return log_normal_density(0.8, x, 0.6); };
  double const half = std::log(1.0 / normal_below(-0.5));  // 1 / P(x > 0.5)
  // clang-format off
  return {
      {"both readings", run, given({{0.8, 0.6}, {1.4, 0.5}})},
      {"streams kept", streams, given({{0.8, 0.6}, {1.4, 0.5}})},
      {"without one", [=](auto seed, auto size) { return run(seed, size).without("float"); }, given({{0.8, 0.6}})},
      {"only the other", [=](auto seed, auto size) { return run(seed, size).only("float"); }, given({{1.4, 0.5}})},
      {"weighed again", [=](auto seed, auto size) { return run(seed, size).reweigh(weighter_of_points(normal_reading(-0.5, 0.8))); }, given({{-0.5, 0.8}})},
      {"weighed again, sharper", [=](auto seed, auto size) { return run(seed, size).reweigh(weighter_of_points(normal_reading(1.0, 0.1))); }, given({{1.0, 0.1}})},
      {"before any", [=](auto seed, auto size) { return run(seed, size).before(); }, normal(0, 1, 0)},
      {"given an event", [=](auto seed, auto size) { return run(seed, size).given(positive); }, normal_under(both, 0.5, 8, half)},
      {"without one, given an event", [=](auto seed, auto size) { return run(seed, size).without("float").given(positive); }, normal_under(one, 0.5, 8, half)},
      {"extended to the size", [=](auto seed, auto size) { return pipe.extend(run(seed, size / 3), size - size / 3); }, given({{0.8, 0.6}, {1.4, 0.5}})},
  };
  // clang-format on
}

constexpr std::size_t questions_each = 4;
constexpr char const* question[questions_each] = {"mean", "probability", "median", "log evidence"};

std::vector<asked> ask(sample_t const& sample, posterior const& exact, double edge, double above) {
  auto const answers =
      sample.estimate(sy::expectation(&point::x), sy::probability([=](point const& p) { return p.x > edge; }),
                      sy::quantile(&point::x, 0.5), sy::log_evidence());
  auto const& [mean, probability, median, evidence] = answers;
  return {{mean, exact.mean}, {probability, above}, {median, exact.quantile(0.5)}, {evidence, exact.log_evidence}};
}

/// What the rule says of a cell; what it adds to the pool.
struct pooled {
  std::uint64_t runs = 0, sound_and_far = 0, promising = 0;
  void judge(std::string const& name, std::size_t size, std::string const& asked_of, cell const& c) {
    print(name, size, asked_of, c, "");
    runs += c.runs;
    sound_and_far += c.sound_and_far;
    if (!c.promises()) return;
    ++promising;
    INFO(name, ", ", size, " states, ", asked_of);
    for (std::size_t l = 0; l < levels.size(); ++l) {
      int const where = c.verdict_on(l);
      INFO("at level ", levels[l], ": ", c.hits[l], " hits of ", c.runs);
      CHECK_MESSAGE(where >= 0, "intervals are too narrow");
      CHECK_MESSAGE(where <= 0, "intervals are too wide");
    }
  }
  void close(std::uint64_t expected) const {
    std::printf(
        "%llu cells with at least 95 %% sound runs; sound and off by more than four standard errors: %llu of %llu "
        "runs\n",
        static_cast<unsigned long long>(promising), static_cast<unsigned long long>(sound_and_far),
        static_cast<unsigned long long>(runs));
    CHECK(promising >= expected);
    CHECK(1'000 * sound_and_far <= runs);
  }
};

}  // namespace

TEST_CASE("samples changed after they were drawn: intervals cover what they claim") {
  pooled all;
  print_heading();
  for (change const& each : changes())
    for (std::size_t const size : sizes) {
      if (!honest() && size == 10'000) continue;
      double const edge = each.exact.quantile(0.9), above = 1.0 - each.exact.below(edge);
      std::vector<cell> const cells = ask_often(honest() ? 4'000 : 1'000, [&](std::uint64_t seed) {
        return ask(each.sample(seed, size), each.exact, edge, above);
      });
      for (std::size_t q = 0; q < cells.size(); ++q) all.judge(each.name, size, question[q], cells[q]);
      std::fflush(stdout);
    }
  all.close(20);
}

TEST_CASE("answers in one pass: intervals cover what they claim") {
  auto const pipe = two_readings();
  posterior const exact = given({{0.8, 0.6}, {1.4, 0.5}});
  double const edge = exact.quantile(0.9);
  pooled all;
  print_heading();
  for (std::size_t const size : sizes) {
    std::vector<cell> const cells = ask_often(honest() ? 4'000 : 1'000, [&](std::uint64_t seed) {
      auto const answers =
          pipe.estimate({.size = size, .seed = seed}, sy::expectation(&point::x),
                        sy::probability([=](point const& p) { return p.x > edge; }), sy::log_evidence(),
                        sy::difference(&point::x, [](point const& p) { return p.x * p.x; }));
      auto const& [mean, probability, evidence, difference] = answers;
      return std::vector<asked>{{mean, exact.mean},
                                {probability, 0.1},
                                {evidence, exact.log_evidence},
                                {difference, exact.mean - exact.variance - exact.mean * exact.mean}};
    });
    char const* const names[] = {"mean", "probability", "log evidence", "difference"};
    for (std::size_t q = 0; q < cells.size(); ++q) all.judge("one pass", size, names[q], cells[q]);
  }
  all.close(8);
}
