// SPDX-License-Identifier: BSL-1.0
// legs: plain
// What tempered runs refuse, and what they say against themselves.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <random>
#include <stdexcept>
#include <stop_token>
#include <string>

#include <steelyard/tempered.hpp>

#include "harder_support.hpp"
#include "law_support.hpp"

namespace sy = steelyard;
using harder::agrees;
using harder::conjugate;
using harder::first_of;
using law::said;

namespace {

bool finds(sy::diagnosis const& health, sy::finding_kind kind, std::string const& words) {
  for (sy::finding const& each : health.findings())
    if (each.kind == kind && each.text.find(words) != std::string::npos) return true;
  return false;
}

using four = conjugate<4>;
sy::tempered_plan small(std::uint64_t seed = 1) { return {.seed = seed, .chains = 50, .draws = 1000}; }

}  // namespace

TEST_CASE("an exact draw that leads nowhere, or throws, is named") {
  auto const sampler = [](sy::draws& draws) { return draws.uniform(); };
  auto const weighter = [](double u) { return u < 0.9 ? sy::log_likelihood{-40.0 * u} : sy::log_likelihood{-INFINITY}; };
  sy::pipeline const pipe{sampler, weighter};
  auto const nowhere = [](double, double, sy::draws&, sy::block_words& block) { block.set_uniform(0, 0.95); };
  CHECK(said<sy::bad_argument>([&] { sy::run_tempered(pipe, small(), sy::exact_draw(0, 1, nowhere)); })
            .find("the exact draw of words 0 to 0 led to an impossible state in a move of chain") != std::string::npos);
  auto const outside = [](double, double, sy::draws&, sy::block_words& block) { block.set_uniform(0, 1.0); };
  CHECK(said<sy::failed_sample>([&] { sy::run_tempered(pipe, small(), sy::exact_draw(0, 1, outside)); })
            .find("an exact draw in a move of chain") != std::string::npos);
  CHECK(said<sy::bad_argument>([&] { sy::run_tempered(pipe, small(), sy::refresh_together{0, 0}); })
            .find("a block of 0 words cannot be moved") != std::string::npos);
}

TEST_CASE("a sampler that keeps something between calls is refused before the first move") {
  auto const keeps = [](sy::draws& draws) {
    static std::normal_distribution<double> law(0.0, 1.0);
    return law(draws);
  };
  auto const weighter = [](double x) { return sy::log_likelihood{-50.0 * (x - 3.0) * (x - 3.0)}; };
  auto const words = said<sy::hidden_state>([&] { sy::run_tempered(sy::pipeline{keeps, weighter}, small()); });
  CHECK(words.find("run_tempered: ") == 0);
  CHECK(words.find("distribution object") != std::string::npos);
}

TEST_CASE("an inner engine seeded from one word: not mixed, few lineages, and what to do") {
  auto const sampler = [](sy::draws& draws) {
    std::mt19937_64 engine(draws());
    std::array<double, 4> x{};
    for (double& v : x) v = 4.0 * (static_cast<double>(engine() >> 11) * 0x1p-53) - 2.0;
    return x;
  };
  sy::pipeline const pipe{sampler, four{0.02}};
  auto how = small();
  how.longest = 40;
  auto const sample = sy::run_tempered(pipe, how);
  auto const& health = sample.diagnosis();
  CHECK(health.verdict() != sy::verdict::sound);
  CHECK(health.lineages() < 20.0);
  CHECK(finds(health, sy::finding_kind::not_mixed, "seed no engine of your own from a word"));
  CHECK(finds(health, sy::finding_kind::few_groups, "use more chains"));
  CHECK(sample.expectation(&first_of<4>).verdict() != sy::verdict::sound);
  CHECK(sample.log_evidence().verdict() != sy::verdict::sound);
}

TEST_CASE("asked without the sharp reading, a tempered sample is not sound and advises a rerun") {
  auto const sampler = [](sy::draws& draws) {
    double const a = draws.normal(), b = draws.normal();
    return std::array<double, 4>{a, b, 0.0, 0.0};
  };
  auto const reads = [](std::size_t which, double sd) {
    return sy::named(which == 0 ? "sharp" : "blunt", [which, sd](std::array<double, 4> const& x) {
      double const z = (1.0 - x[which]) / sd;
      return sy::log_likelihood{-0.5 * z * z};
    });
  };
  sy::pipeline const pipe{sampler, sy::together(reads(0, 1e-3), reads(1, 3.0))};
  auto const sample = sy::run_tempered(pipe, small());
  CHECK(sample.diagnosis().verdict() == sy::verdict::sound);

  auto const not_sound = [](auto const& other) {
    CHECK(other.diagnosis().verdict() != sy::verdict::sound);
    CHECK(finds(other.diagnosis(), sy::finding_kind::far_from_drawn, "Run again"));
    CHECK(other.expectation(&first_of<4>).verdict() != sy::verdict::sound);
  };
  not_sound(sample.without("sharp"));
  not_sound(sample.before());
  not_sound(sample.reweigh([](std::array<double, 4> const& x) { return sy::log_likelihood{-0.5 * x[0] * x[0]}; }));
  // The blunt reading hardly matters, and may be taken out.
  auto const rest = sample.without("blunt");
  CHECK(rest.diagnosis().verdict() == sy::verdict::sound);
  agrees(rest.expectation(&first_of<4>), 1.0 / (1.0 + 1e-6));
}

TEST_CASE("plans, likelihoods and samplers that cannot serve are refused in one sentence") {
  sy::pipeline const pipe{&four::sampler, four{0.03}};
  auto const refused = [&](sy::tempered_plan const& how, std::string const& words) {
    std::string const text = said<sy::bad_argument>([&] { sy::run_tempered(pipe, how); });
    CAPTURE(text);
    CHECK(text.find(words) != std::string::npos);
    CHECK(text.find('\n') == std::string::npos);
  };
  double const nan = std::numeric_limits<double>::quiet_NaN();
  refused({.chains = 7}, "chains are 7; at least 8 are needed");
  refused({.share = 0.0}, "share is 0; it must lie between 0 and 1");
  refused({.share = 1.0}, "share is 1;");
  refused({.share = nan}, "it must lie between 0 and 1");
  refused({.level_share = nan}, "level_share is");
  refused({.draws = 10}, "draws are 10; at least one a chain");
  refused({.shortest = 1}, "shortest chain is 1");
  refused({.shortest = 30, .longest = 20}, "longest chain is 20");

  std::stop_source source;
  source.request_stop();
  CHECK(said<sy::stopped_early>([&] { sy::run_tempered(pipe, {.token = source.get_token()}); })
            .find("before the first rung") != std::string::npos);

  auto const weighed = [](double l) {
    return sy::pipeline{&four::sampler, [l](std::array<double, 4> const&) { return sy::log_likelihood{l}; }};
  };
  CHECK(said<sy::bad_weight>([&] { sy::run_tempered(weighed(nan), small()); }).find("the weighter in draw 0") != std::string::npos);
  CHECK(said<sy::bad_weight>([&] { sy::run_tempered(weighed(INFINITY), small()); }).find("the weighter in draw 0") != std::string::npos);
  auto const throws = [](sy::draws&) -> std::array<double, 4> { throw std::runtime_error("no ice today"); };
  CHECK(said<sy::failed_sample>([&] { sy::run_tempered(sy::pipeline{throws, four{0.1}}, small()); }).find("no ice today") !=
        std::string::npos);
  // Beyond what arithmetic bears: two log-likelihoods whose difference overflows, and too few draws have the higher one.
  auto const cliff = [](std::array<double, 4> const& x) { return sy::log_likelihood{x[0] > 1.0 ? 1e308 : -1e308}; };
  CHECK(!said<sy::error>([&] { sy::run_tempered(sy::pipeline{&four::sampler, cliff}, small()); }).empty());
}

TEST_CASE("a stop between rungs leaves a sample under weights, and says so") {
  sy::pipeline const pipe{&four::sampler, four{0.03}};
  auto how = small();
  std::stop_source source;
  how.token = source.get_token();
  how.progress = [&](sy::progress_report const&) { source.request_stop(); };
  auto const sample = sy::run_tempered(pipe, how);
  CHECK(finds(sample.diagnosis(), sy::finding_kind::stopped, "a stop was asked for"));
  CHECK(sample.diagnosis().verdict() != sy::verdict::sound);
}

TEST_CASE("runs that fail are set aside where the plan says so") {
  auto const sampler = [](sy::draws& draws) -> std::array<double, 4> {
    auto const x = four::sampler(draws);
    if (x[3] > 1.5) throw std::runtime_error("diverged");
    return x;
  };
  auto how = small();
  CHECK(said<sy::failed_sample>([&] { sy::run_tempered(sy::pipeline{sampler, four{0.1}}, how); }).find("diverged") !=
        std::string::npos);
  how.on_failure = sy::failures::set_aside;
  auto const sample = sy::run_tempered(sy::pipeline{sampler, four{0.1}}, how);
  CHECK(finds(sample.diagnosis(), sy::finding_kind::failed_runs, "set aside"));
  agrees(sample.expectation(&first_of<4>), four{0.1}.mean());
}
