// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/core.hpp>

#include <boost/math/distributions/gamma.hpp>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdio>
#include <functional>
#include <string>
#include <vector>

#include "statistics/cells.hpp"
#include "statistics/exact.hpp"
#include "statistics/sources.hpp"

// Runs that stop where a standard error is small enough: the look at the error bar must not spoil it. One line a cell:
// coverage at 90, 95 and 99 % over all runs, and how far runs went.

namespace {

using namespace known;

/// A run that was told to stop at a target.
struct stopped {
  asked answer;
  std::uint64_t drawn = 0;
  bool reached = false;
};

struct stopping {
  std::string name;
  std::function<stopped(std::uint64_t seed)> run;
};

constexpr std::uint64_t most = 65'536;

using pipeline_of_points = sy::pipeline<sampler_of_points, weighter_of_points>;

template <class Question, class Target>
std::function<stopped(std::uint64_t)> until_met(pipeline_of_points pipe, Question question, Target target, double truth) {
  return [=](std::uint64_t seed) {
    auto const answers = pipe.estimate({.size = most, .seed = seed}, sy::until(question, target));
    auto const& e = answers.template get<0>();
    return stopped{{e, truth}, answers.drawn(), answers.drawn() < most};
  };
}

std::vector<stopping> stoppings() {
  auto const x = &point::x;
  auto const above = [](double edge) { return sy::probability([edge](point const& p) { return p.x > edge; }); };
  pipeline_of_points const wide{normal_prior(0, 1), normal_reading(1, 1)};
  pipeline_of_points const sharp{normal_prior(0, 1), normal_reading(1, 0.1)};
  pipeline_of_points const skewed{lognormal_prior(0, 1), no_reading()};
  pipeline_of_points const heavy{gamma_prior(1, 1), scored([](double v) { return 0.3 * v; })};
  posterior const of_wide = normal_given(1, 1), of_sharp = normal_given(1, 0.1);
  posterior const of_heavy = known_as(boost::math::gamma_distribution<double, quiet>(1, 1.0 / 0.7), -std::log(0.7));
  double const e1 = of_wide.quantile(0.99), e2 = of_sharp.quantile(0.98), third = std::sqrt(std::exp(1.0));
  auto const second = of_wide.variance + of_wide.mean * of_wide.mean;
  // clang-format off
  return {
      {"wide normal, mean to 0.01", until_met(wide, sy::expectation(x), 0.01, of_wide.mean)},
      {"wide normal, mean to 5 %", until_met(wide, sy::expectation(x), sy::relative(0.05), of_wide.mean)},
      {"wide normal, tail of 1 % to 10 %", until_met(wide, above(e1), sy::relative(0.1), 0.01)},
      {"wide normal, tail of 1 % to 0.004", until_met(wide, above(e1), 0.004, 0.01)},
      {"wide normal, evidence to 0.008", until_met(wide, sy::log_evidence(), 0.008, of_wide.log_evidence)},
      {"wide normal, ratio to 3 %", until_met(wide, sy::ratio(x, [](point const& p) { return p.x * p.x; }), sy::relative(0.03), of_wide.mean / second)},
      {"sharp normal, mean to 0.004", until_met(sharp, sy::expectation(x), 0.004, of_sharp.mean)},
      {"sharp normal, tail of 2 % to 25 %", until_met(sharp, above(e2), sy::relative(0.25), 0.02)},
      {"sharp normal, evidence to 0.03", until_met(sharp, sy::log_evidence(), 0.03, of_sharp.log_evidence)},
      {"lognormal, mean to 0.03", until_met(skewed, sy::expectation(x), 0.03, third)},
      {"lognormal, mean to 3 %", until_met(skewed, sy::expectation(x), sy::relative(0.03), third)},
      {"weights of tail 0.3, mean to 0.03", until_met(heavy, sy::expectation(x), 0.03, of_heavy.mean)},
  };
  // clang-format on
}

}  // namespace

TEST_CASE("where runs stop at a target, intervals cover what they claim") {
  std::uint64_t const repeats = honest() ? 4'000 : 1'000;
  std::uint64_t runs = 0, sound_and_far = 0, promising = 0, cut_short = 0;
  print_heading();
  for (stopping const& each : stoppings()) {
    std::vector<stopped> all(static_cast<std::size_t>(repeats));
    sy::on_threads(0)(all.size(), [&](std::size_t i) { all[i] = each.run(i + 1); });
    cell c;
    double drawn = 0.0;
    std::uint64_t reached = 0, least = most;
    for (stopped const& one : all) {
      c.add(one.answer);
      drawn += static_cast<double>(one.drawn) / static_cast<double>(repeats);
      reached += one.reached ? 1u : 0u;
      least = std::min(least, one.drawn);
      CHECK((!one.reached || one.drawn == 1'024u || one.drawn % 2'048u == 0u));
    }
    INFO(each.name);
    cut_short += repeats - reached;
    CHECK(2 * reached > repeats);  // stopping is what is looked at here
    runs += c.runs;
    sound_and_far += c.sound_and_far;
    print(each.name, static_cast<std::size_t>(drawn), "at stopping", c, "from " + std::to_string(least));
    if (!c.promises()) continue;
    ++promising;
    for (std::size_t l = 0; l < levels.size(); ++l) {
      int const where = c.verdict_on(l);
      INFO("at level ", levels[l], ": ", c.hits[l], " hits of ", c.runs);
      CHECK_MESSAGE(where >= 0, "intervals are too narrow");
      CHECK_MESSAGE(where <= 0, "intervals are too wide");
    }
  }
  std::printf(
      "%llu of the cells with at least 95 %% sound runs; %llu runs ended at %llu samples; sound and far off: %llu of "
      "%llu\n",
      static_cast<unsigned long long>(promising), static_cast<unsigned long long>(cut_short),
      static_cast<unsigned long long>(most), static_cast<unsigned long long>(sound_and_far),
      static_cast<unsigned long long>(runs));
  CHECK(promising >= 8u);
  CHECK(1'000 * sound_and_far <= runs);
}
