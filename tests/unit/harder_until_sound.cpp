// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Plain weighting first, more of it where little is missing, a tempered run where the reading is too sharp for it.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <string>

#include <steelyard/tempered.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::said;

namespace {

double sampler(sy::draws& draws) { return draws.normal(); }

/// x read as 0.5 with standard deviation s.
struct reads {
  double s;
  sy::log_likelihood operator()(double x) const {
    double const z = (0.5 - x) / s;
    return sy::log_likelihood{-0.5 * z * z};
  }
  double mean() const { return 0.5 / (1.0 + s * s); }
  double log_evidence() const { return 0.5 * std::log(s * s / (1.0 + s * s)) - 0.125 / (1.0 + s * s); }
};

double itself(double x) { return x; }

auto answer(double s, sy::plan const& how) {
  return sy::run_until_sound(sy::pipeline{&sampler, reads{s}}, how, sy::expectation(&itself), sy::log_evidence());
}

template <class Answers>
void agrees(Answers const& all, double s) {
  auto const [mean, evidence] = all;
  CHECK(mean.verdict() == sy::verdict::sound);
  CHECK(std::abs(mean.value - reads{s}.mean()) <= 5.0 * mean.standard_error);
  CHECK(std::abs(evidence.value - reads{s}.log_evidence()) <= 5.0 * evidence.standard_error);
}

template <class Answers>
std::string cost_of(Answers const& all) {
  for (sy::finding const& each : all.diagnosis().findings())
    if (each.kind == sy::finding_kind::cost) return each.text;
  return {};
}
bool has(std::string const& text, std::string const& words) { return text.find(words) != std::string::npos; }

}  // namespace

TEST_CASE("a blunt reading is answered by plain weighting, as ever") {
  auto const all = answer(1.0, {.size = 4000});
  agrees(all, 1.0);
  CHECK(all.tempered_calls() == 0);
  CHECK(all.sample().how_drawn() == sy::how_drawn::independent);
  CHECK(has(cost_of(all), "That carries the questions."));
  auto const plain = sy::pipeline{&sampler, reads{1.0}}.run({.size = 4000});
  auto const mean = all.get<0>();
  CHECK(mean.value == plain.expectation(&itself).value);
  CHECK(all.plain_calls() == plain.sampler_calls());
  CHECK(all.sampler_calls() == plain.sampler_calls());
}

TEST_CASE("where little is missing, plain weighting goes on") {
  // A declared bound on the likelihood is what lets error bars be trusted to shrink.
  sy::pipeline const bounded{&sampler, sy::bounded(reads{0.1}, 0.0)};
  auto const all = sy::run_until_sound(bounded, {.size = 256}, sy::expectation(&itself), sy::log_evidence());
  CAPTURE(cost_of(all));
  CHECK(all.tempered_calls() == 0);
  CHECK(all.drawn() > 256);
  CHECK(all.drawn() < 20'000);
  CHECK(has(cost_of(all), "More draws took another"));
  CHECK(all.diagnosis().verdict() == sy::verdict::sound);
  agrees(all, 0.1);
}

TEST_CASE("a sharp reading is tempered, and the costs add up") {
  auto const all = answer(1e-5, {.size = 4000});
  std::string const text = cost_of(all);
  CAPTURE(text);
  agrees(all, 1e-5);
  CHECK(all.sample().how_drawn() == sy::how_drawn::lineages);
  CHECK(all.plain_calls() >= 4000);
  CHECK(all.tempered_calls() > 4000);
  CHECK(all.sampler_calls() == all.plain_calls() + all.tempered_calls());
  CHECK(has(text, "Plain weighting took " + std::to_string(all.plain_calls())));
  CHECK(has(text, "A tempered run took " + std::to_string(all.tempered_calls())));
  // KL of the posterior from the prior is 11.1 here: e^11.1 is 7e4.
  CHECK(has(text, "at least about"));
  double const asked = sy::detail::plain_draws_asked_for(all.sample());
  double const s = 1e-5, v = s * s / (1.0 + s * s), kl = 0.5 * (v + 0.25 - 1.0 - std::log(v));
  CHECK(std::abs(std::log(asked) - kl) < 0.5);
}

TEST_CASE("what is rare under sound weights is left to other means, and that is said") {
  auto const all = sy::run_until_sound(sy::pipeline{&sampler, reads{1.0}}, {.size = 4000}, sy::probability([](double x) { return x > 6.0; }),
                                       sy::coverage_interval(&itself, 0.9));
  CHECK(all.tempered_calls() == 0);
  CHECK(all.get<0>().verdict() != sy::verdict::sound);
  CHECK(has(cost_of(all), "ask low_probability()"));
}

TEST_CASE("a tempered run that does no better leaves plain answers standing, and says so") {
  sy::tempered_plan sharp;
  sharp.chains = 8;
  sharp.longest = 20;
  // One word decides all: no move is small. Eight chains end in one lineage or two.
  auto const hashed = [](sy::draws& draws) {
    std::uint64_t w = draws();
    w = (w ^ (w >> 31)) * 0x9E3779B97F4A7C15u;
    w = (w ^ (w >> 29)) * 0xBF58476D1CE4E5B9u;
    return static_cast<double>((w ^ (w >> 32)) >> 11) * 0x1p-53;
  };
  auto const all = sy::run_until_sound(sy::pipeline{hashed, reads{0.001}}, {.size = 10'000}, sharp, sy::expectation(&itself));
  std::string const text = cost_of(all);
  CAPTURE(text);
  CHECK(all.tempered_calls() > 0);
  CHECK(all.sampler_calls() == all.plain_calls() + all.tempered_calls());
  CHECK(all.diagnosis().verdict() != sy::verdict::sound);
}

TEST_CASE("a tempered plan that cannot serve is refused before anything is drawn") {
  std::uint64_t calls = 0;
  auto const counted = [&calls](sy::draws& draws) {
    ++calls;
    return draws.normal();
  };
  sy::tempered_plan sharp;
  sharp.chains = 2;
  CHECK(has(said<sy::bad_argument>([&] { sy::run_until_sound(sy::pipeline{counted, reads{1.0}}, {}, sharp, sy::log_evidence()); }),
            "run_until_sound: the plan's chains are 2"));
  CHECK(calls == 0);
}
