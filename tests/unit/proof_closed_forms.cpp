// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/core.hpp>
#include <steelyard/proof/agrees.hpp>
#include <steelyard/proof/closed_forms.hpp>
#include <steelyard/proof/linear_normal.hpp>
#include <steelyard/proof/progress.hpp>

#include <array>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <string>
#include <thread>
#include <vector>

namespace sy = steelyard;
namespace kit = steelyard::proof;

namespace {

auto const itself = [](double x) { return x; };

/// The plumbing: a pipeline of the model answers what the model says.
template <class Model>
void plumbing_holds(Model const& model, double sd_truth) {
  sy::pipeline const pipe{model.sampler(), model.weighter()};
  auto const sample = pipe.run({.size = 20'000});
  CHECK(kit::agrees(sample.expectation(itself), model.mean(), {.difference = 0.2 * sd_truth}));
  CHECK(kit::agrees(sample.log_evidence(), model.log_evidence()));
  double const upper = quantile(model.posterior(), 0.9);
  CHECK(kit::agrees(sample.probability([=](double x) { return x > upper; }), 0.1));
  CHECK(model.sd() == doctest::Approx(standard_deviation(model.posterior())).epsilon(1e-12));
  CHECK(model.mean() == doctest::Approx(mean(model.posterior())).epsilon(1e-12));
  CHECK_FALSE(kit::agrees(sample.expectation(itself), model.mean() + 0.5 * sd_truth));
}

}  // namespace

TEST_CASE("closed forms meet published posteriors") {
  // Michelson 1879 (100 readings, mean 852.4, sd 79 known, prior N(800, 100^2)): one reading of their mean.
  kit::normal_normal const light(800.0, 100.0, 852.4, 7.9);
  CHECK(light.mean() == doctest::Approx(852.074999925465).epsilon(1e-9));
  CHECK(light.sd() == doctest::Approx(7.8754628427517).epsilon(1e-12));
  // Owen, Monte Carlo theory, methods and examples, 2013, ch. 9; log-evidence of the normalised density.
  CHECK(kit::normal_normal(0, 1, 3, 0.5).log_evidence() == doctest::Approx(-4.63051030886178).epsilon(1e-13));
  // Bortkiewicz 1898: 280 corps-years with 0 to 4 deaths.
  std::vector<unsigned> kicks;
  for (auto const& [deaths, years] : {std::pair{0u, 144}, {1u, 91}, {2u, 32}, {3u, 11}, {4u, 2}})
    kicks.insert(kicks.end(), static_cast<std::size_t>(years), deaths);
  kit::gamma_poisson const horses(2, 2, kicks);
  CHECK(horses.mean() == doctest::Approx(0.702127659574468).epsilon(1e-13));
  CHECK(horses.sd() == doctest::Approx(0.0498980399981216).epsilon(1e-12));
  CHECK(quantile(horses.posterior(), 0.975) == doctest::Approx(0.803240205169).epsilon(1e-10));
  CHECK(horses.log_evidence() == doctest::Approx(-316.6053793143109).epsilon(1e-12));
  // uniform prior: every number of hits is as likely, 1/(n+1)                               [Bayes 1763]
  CHECK(kit::beta_binomial(1, 1, 3, 20).log_evidence() == doctest::Approx(-std::log(21.0)).epsilon(1e-12));
  CHECK(kit::beta_binomial(1, 1, 3, 20).mean() == doctest::Approx(4.0 / 22.0).epsilon(1e-13));
}

TEST_CASE("a pipeline of each model answers what the model says") {
  plumbing_holds(kit::normal_normal(0.5, 1.0, 1.2, 0.7), 0.57);
  plumbing_holds(kit::gamma_poisson(2.0, 0.5, {3, 5, 2}), 0.9);
  plumbing_holds(kit::beta_binomial(2.0, 3.0, 4, 10), 0.13);
}

TEST_CASE("linear model: one unknown is the normal model, two by hand, and what a pipeline answers") {
  kit::normal_normal const plain(0.5, 2.0, 1.2, 0.7);
  kit::linear_normal<1, 1> const one({0.5}, {{{4.0}}}, {{{1.0}}}, {1.2}, {{{0.49}}});
  CHECK(one.mean(0) == doctest::Approx(plain.mean()).epsilon(1e-13));
  CHECK(one.sd(0) == doctest::Approx(plain.sd()).epsilon(1e-13));
  CHECK(one.log_evidence() == doctest::Approx(plain.log_evidence()).epsilon(1e-13));

  // Standard prior, the sum read as 3 with variance 1: S = 3, mean 3 * 1/3 each, covariance I - 1/3.
  kit::linear_normal<2, 1> const sum({0, 0}, {{{1, 0}, {0, 1}}}, {{{1, 1}}}, {3}, {{{1}}});
  CHECK(sum.mean(0) == doctest::Approx(1.0).epsilon(1e-13));
  CHECK(sum.covariance(0, 0) == doctest::Approx(2.0 / 3.0).epsilon(1e-13));
  CHECK(sum.covariance(0, 1) == doctest::Approx(-1.0 / 3.0).epsilon(1e-13));
  CHECK(sum.log_evidence() == doctest::Approx(-1.5 - 0.5 * std::log(3.0) - 0.918938533204672741780).epsilon(1e-13));

  // Both unknowns read with errors of correlation 1/2: reading them one after the other gives the same.
  kit::linear_normal<2, 2> const both({1, -1}, {{{1.0, 0.3}, {0.3, 0.5}}}, {{{1, 0}, {0.5, 2}}}, {1.4, -0.2},
                                      {{{0.2, 0.05}, {0.05, 0.3}}});
  sy::pipeline const pipe{both.sampler(), both.weighter()};
  auto const sample = pipe.run({.size = 40'000});
  for (std::size_t i = 0; i < 2; ++i)
    CHECK(kit::agrees(sample.expectation([i](std::array<double, 2> const& x) { return x[i]; }), both.mean(i)));
  CHECK(kit::agrees(
      sample.expectation([&](std::array<double, 2> const& x) { return (x[0] - both.mean(0)) * (x[1] - both.mean(1)); }),
      both.covariance(0, 1)));
  CHECK(kit::agrees(sample.log_evidence(), both.log_evidence()));
  CHECK(cdf(both.posterior(1), both.mean(1)) == doctest::Approx(0.5));
}

TEST_CASE("bad input to the closed forms") {
  CHECK_THROWS_WITH_AS(kit::normal_normal(0, -1, 0, 1),
                       "normal_normal: the prior sd, -1, must be a positive finite number", sy::bad_argument);
  CHECK_THROWS_AS(kit::gamma_poisson(0, 1, {1}), sy::bad_argument);
  CHECK_THROWS_AS(kit::beta_binomial(1, 1, 5, 4), sy::bad_argument);
  CHECK_THROWS_AS((kit::linear_normal<1, 1>({0}, {{{-1}}}, {{{1}}}, {0}, {{{1}}})), sy::bad_argument);
  CHECK_THROWS_AS((kit::linear_normal<2, 1>({0, 0}, {{{1, 0.5}, {0.4, 1}}}, {{{1, 1}}}, {0}, {{{1}}})),
                  sy::bad_argument);
}

TEST_CASE("the progress line waits two seconds, is rewritten seldom, and ends") {
  std::FILE* const file = std::tmpfile();
  REQUIRE(file != nullptr);
  auto const text = [&] {
    std::string all;
    std::rewind(file);
    for (int c = std::fgetc(file); c != EOF; c = std::fgetc(file)) all += static_cast<char>(c);
    return all;
  };
  kit::progress const quick = kit::progress_line("tank", file);
  quick(1, 2);
  quick(2, 2);
  CHECK(text().empty());
  kit::progress const slow = kit::progress_line("tank", file);
  std::this_thread::sleep_for(std::chrono::milliseconds(2'050));
  slow(1, 3);
  slow(2, 3);
  slow(3, 3);
  CHECK(text() == "\rtank: 1 of 3 repeats\rtank: 3 of 3 repeats\n");
  std::fclose(file);
}
