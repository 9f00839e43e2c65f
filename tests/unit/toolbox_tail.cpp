// SPDX-License-Identifier: BSL-1.0
// Tail index of the largest weights, what a diagnosis makes of it, and advice on sample size.

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <fstream>
#include <limits>
#include <sstream>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::holds;
using law::itself;
using law::said;

namespace {

std::vector<double> excesses(double threshold) {
  std::ifstream file(std::string(STEELYARD_TEST_DATA) + "/danish_fire.csv");
  std::vector<double> all;
  for (std::string line; std::getline(file, line);) {
    if (line.empty() || line[0] == '#' || line.find("date") == 0) continue;
    double const loss = std::stod(line.substr(line.find(',') + 1));
    if (loss > threshold) all.push_back(loss - threshold);
  }
  std::sort(all.begin(), all.end());
  return all;
}

/// Proposal Exp(1), target Exp(r): the weight is Pareto with shape 1 - r exactly.
auto pareto(double shape, std::uint64_t size, std::uint64_t seed) {
  sy::pipeline const pipe{[](sy::draws& draws) { return draws.exponential(1.0); },
                          [shape](double x) { return sy::log_likelihood{shape * x}; }};
  return pipe.run({.size = size, .seed = seed});
}

}  // namespace

TEST_CASE("tail: Danish fire losses, McNeil, ASTIN Bulletin 27(1), 1997") {
  // Shape and scale by Zhang & Stephens computed elsewhere to these digits; the maximum likelihood fit beside it.
  struct row {
    double threshold;
    std::size_t n;
    double shape, scale, likelihood_shape, its_error;
  };
  for (row const& r : {row{3.0, 532, 0.668923714994, 2.186323341054, 0.66761, 0.0731},
                       row{10.0, 109, 0.514148637022, 6.857327648161, 0.496986, 0.1363}}) {
    auto const x = excesses(r.threshold);
    REQUIRE(x.size() == r.n);
    sy::pareto_tail const tail = sy::fit_pareto_tail(x);
    CHECK(tail.known);
    CHECK(tail.shape == doctest::Approx(r.shape).epsilon(1e-11));
    CHECK(tail.scale == doctest::Approx(r.scale).epsilon(1e-11));
    CHECK(std::abs(tail.shape - r.likelihood_shape) < 0.2 * r.its_error);
    CHECK(tail.standard_error == doctest::Approx(r.its_error).epsilon(0.06));
  }
}

TEST_CASE("tail: quantiles of the law itself, Zhang & Stephens, Technometrics 51(3), 2009") {
  struct row {
    double shape;
    int n;
    double fitted_shape, fitted_scale;
  };
  for (row const& r :
       {row{0.2, 100, 0.215375535532620, 0.980905479447337}, row{0.7, 1000, 0.699709746113259, 0.999701111213427}}) {
    std::vector<double> x;
    for (int i = 1; i <= r.n; ++i) x.push_back((std::pow(1.0 - (i - 0.5) / r.n, -r.shape) - 1.0) / r.shape);
    sy::pareto_tail const tail = sy::fit_pareto_tail(x);
    CHECK(tail.shape == doctest::Approx(r.fitted_shape).epsilon(1e-13));
    CHECK(tail.scale == doctest::Approx(r.fitted_scale).epsilon(1e-13));
    for (double& each : x) each *= 1e-12;  // another unit: the shape stays, the scale goes with it
    sy::pareto_tail const scaled = sy::fit_pareto_tail(x);
    CHECK(scaled.shape == doctest::Approx(tail.shape).epsilon(1e-12));
    CHECK(scaled.scale == doctest::Approx(1e-12 * tail.scale).epsilon(1e-12));
  }
  // Shape 0 is the exponential law, shape -1 the uniform one.
  std::vector<double> exponential, uniform;
  for (int i = 1; i <= 4000; ++i) {
    exponential.push_back(-std::log1p(-(i - 0.5) / 4000.0));
    uniform.push_back((i - 0.5) / 4000.0);
  }
  CHECK(std::abs(sy::fit_pareto_tail(exponential).shape) < 0.01);
  CHECK(std::abs(sy::fit_pareto_tail(uniform).shape + 1.0) < 0.05);
}

TEST_CASE("tail: what cannot be fitted, and what is refused") {
  CHECK_FALSE(sy::fit_pareto_tail(std::vector<double>{}).known);
  CHECK_FALSE(sy::fit_pareto_tail(std::vector<double>{1.0, 2.0, 3.0, 4.0}).known);
  CHECK_FALSE(sy::fit_pareto_tail(std::vector<double>(50, 0.0)).known);
  CHECK(sy::fit_pareto_tail(std::vector<double>(50, 1.0)).known);
  for (std::vector<double> const& bad :
       {std::vector<double>{1.0, 0.5}, {-1.0, 2.0}, {0.0, law::not_a_number()}, {0.0, law::infinity()}})
    CHECK(holds(said<sy::bad_argument>([&] { (void)sy::fit_pareto_tail(bad); }),
                "finite, zero or more, and in rising order"));
}

TEST_CASE("tail: Pareto weights from end to end") {
  for (double const shape : {0.2, 0.5, 0.8})
    for (std::uint64_t const size : {1000u, 30'000u}) {
      CAPTURE(shape);
      CAPTURE(size);
      double sum = 0.0, squares = 0.0, error = 0.0;
      double const repeats = 60.0;
      for (std::uint64_t seed = 0; seed < 60; ++seed) {
        sy::diagnosis const d = pareto(shape, size, seed).diagnosis();
        REQUIRE(d.tail_known());
        sum += d.tail_index();
        squares += (d.tail_index() - shape) * (d.tail_index() - shape);
        error += d.tail_index_error() / repeats;
      }
      // 95 largest of 1000, 256 of 30 000: its own error bar is about right, and its bias well below it.
      CHECK(std::abs(sum / repeats - shape) < 0.35 * error);
      CHECK(std::sqrt(squares / repeats) / error == doctest::Approx(1.0).epsilon(0.3));
    }
}

TEST_CASE("tail: how many of the largest weights") {
  // 25 positive weights give the least five; equal ones among the largest leave the tail unknown.
  auto const of = [](std::size_t n) {
    std::vector<double> x;
    for (std::size_t i = 1; i <= n; ++i)
      x.push_back(std::pow(1.0 - (static_cast<double>(i) - 0.5) / static_cast<double>(n), -0.4));
    return sy::weigh(x, [](double w) { return sy::likelihood{w}; }).diagnosis();
  };
  CHECK_FALSE(of(20).tail_known());
  CHECK(of(25).tail_known());
  CHECK(std::abs(of(100'000).tail_index() - 0.4) < 0.02);
  CHECK_FALSE(
      sy::weigh(std::vector<double>(1000, 1.0), [](double) { return sy::likelihood{1.0}; }).diagnosis().tail_known());
  // The same from the weights by hand: the min(n/5, 3 sqrt n, 256) largest over the next.
  std::vector<double> weights;
  for (std::size_t i = 0; i < 2000; ++i) weights.push_back(std::exp(2.0 * sy::draws(3, i).normal()));
  auto const sample = sy::weigh(weights, [](double w) { return sy::likelihood{w}; });
  std::sort(weights.begin(), weights.end());
  std::vector<double> largest;
  for (std::size_t i = 2000 - 135; i < 2000; ++i)
    largest.push_back(weights[i] - weights[2000 - 136]);  // 3 sqrt 2000 = 134.2
  CHECK(sample.diagnosis().tail_index() == doctest::Approx(sy::fit_pareto_tail(largest).shape).epsilon(1e-10));
}

TEST_CASE("tail: above 0.7 alone it strains and never breaks") {
  sy::diagnosis const heavy = pareto(0.9, 20'000, 4).diagnosis();
  REQUIRE(heavy.tail_index() > 0.7);
  REQUIRE(heavy.effective_size() > 50.0);
  CHECK(heavy.verdict() == sy::verdict::strained);
  bool found = false;
  for (sy::finding const& each : heavy.findings())
    if (each.kind == sy::finding_kind::heavy_tail) {
      found = true;
      CHECK(holds(each.text, "The largest weights fall off slowly, with tail index 0."));
    }
  CHECK(found);
  // A sharp but bounded likelihood reaches it harmlessly: strained at worst while the effective size is 50 or more.
  sy::pipeline const sharp{law::draw_normal, [](double x) { return sy::log_likelihood{-2.0 * (3.0 - x) * (3.0 - x)}; }};
  sy::diagnosis const bounded = sharp.run({.size = 4000, .seed = 1}).diagnosis();
  CHECK(bounded.effective_size() > 50.0);
  CHECK(bounded.verdict() != sy::verdict::broken);
  sy::diagnosis const light = sharp.run({.size = 40'000, .seed = 1}).diagnosis();
  CHECK(light.tail_index() < 0.5);
  CHECK(light.verdict() == sy::verdict::sound);
}

TEST_CASE("tail: samples that answers ask for at least are exp(KL), Chatterjee & Diaconis 2018") {
  // prior N(0, 1), one reading y with sd s: KL(posterior || prior) in closed form
  struct row {
    double y, s, kl;
  };
  for (row const& r :
       {row{0.0, 1.0, 0.0965735902799727}, row{1.0, 1.0, 0.221573590279973}, row{3.0, 0.5, 3.28471895621705}}) {
    sy::pipeline const pipe{law::draw_normal, [r](double x) {
                              double const z = (r.y - x) / r.s;
                              return sy::log_likelihood{-0.5 * z * z};
                            }};
    auto const [health] = pipe.estimate({.size = 200'000, .seed = 2}, sy::health());
    CHECK(std::log(health.least_size()) == doctest::Approx(r.kl).epsilon(0.03));
    CHECK(health.least_size() == doctest::Approx(200'000.0 / health.perplexity()).epsilon(1e-14));
  }
  sy::pipeline const sharp{law::draw_normal, [](double x) { return sy::log_likelihood{-2.0 * (3.0 - x) * (3.0 - x)}; }};
  std::string const few = to_string(sharp.run({.size = 800, .seed = 3}).diagnosis());
  CHECK(holds(few, "The reading asks for at least about "));
}

TEST_CASE("tail: health is the run's own diagnosis") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  sy::plan const plan{.size = 5000, .seed = 3};
  auto const all = pipe.estimate(plan, sy::health(), sy::expectation(itself));
  sy::diagnosis const& health = all.get<0>();
  auto const kept = pipe.run(plan);
  for (sy::diagnosis const& other : {all.diagnosis(), kept.diagnosis(), kept.estimate(sy::health()).get<0>()}) {
    CHECK(law::bits(health) == law::bits(other));
    CHECK(health.tail_index() == other.tail_index());
    CHECK(health.verdict() == other.verdict());
  }
  // w = 1 .. 10: Kish 7.857142857142857, perplexity 8.595868842128647
  std::vector<double> w;
  for (int i = 1; i <= 10; ++i) w.push_back(i);
  auto const [ten] = sy::weigh(w, [](double x) { return sy::likelihood{x}; }).estimate(sy::health());
  CHECK(ten.effective_size() == doctest::Approx(7.857142857142857).epsilon(1e-13));
  CHECK(ten.perplexity() == doctest::Approx(8.595868842128647).epsilon(1e-13));
  CHECK(ten.largest_share() == doctest::Approx(10.0 / 55.0).epsilon(1e-13));
}

TEST_CASE("advice: so many more samples, and the standard error is met") {
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const first = pipe.estimate({.size = 20'000, .seed = 5}, sy::expectation(itself));
  double const target = first.get<0>().standard_error / 3.0;
  sy::sample_advice const advice = sy::more_samples(first.get<0>(), first.diagnosis(), target);
  REQUIRE(advice.known);
  CHECK(static_cast<double>(advice.more) == doctest::Approx(8.0 * 20'000.0).epsilon(1e-9));
  CHECK(holds(advice.text, "About 160000 more samples are needed for a standard error of"));
  auto const longer = pipe.estimate({.size = 20'000 + advice.more, .seed = 5}, sy::expectation(itself));
  CHECK(longer.get<0>().standard_error == doctest::Approx(target).epsilon(0.03));
  CHECK(sy::more_samples(first.get<0>(), first.diagnosis(), 1.0).more == 0);
  CHECK(holds(sy::more_samples(first.get<0>(), first.diagnosis(), 1.0).text, "No more samples are needed"));
  // For a rare event few terms carry the error bar: more for it to be sound.
  auto const rare = pipe.estimate({.size = 1000, .seed = 6}, sy::probability([](double x) { return x > 1.9; }));
  REQUIRE(rare.get<0>().verdict() == sy::verdict::strained);
  sy::sample_advice const sound = sy::more_samples(rare.get<0>(), rare.diagnosis());
  REQUIRE(sound.known);
  CHECK(static_cast<double>(sound.more) ==
        doctest::Approx(1000.0 * (30.0 / rare.get<0>().carriers - 1.0)).epsilon(0.01));
}

TEST_CASE("advice: kept back where it would not be honest") {
  auto const heavy = pareto(0.6, 20'000, 7);
  auto const event = [](double x) { return x > 1.0; };
  sy::estimate const e = heavy.probability(event);
  REQUIRE(heavy.diagnosis().tail_index() > 0.5);
  REQUIRE(e.verdict() != sy::verdict::broken);
  CHECK_FALSE(sy::more_samples(e, heavy.diagnosis(), 1e-3).known);
  CHECK(holds(sy::more_samples(e, heavy.diagnosis()).text, "the largest weights have tail index 0."));
  // The same weights under a declared bound.
  sy::pipeline const bounded{[](sy::draws& draws) { return draws.exponential(1.0); },
                             sy::bounded([](double x) { return sy::log_likelihood{0.6 * x}; }, 60.0)};
  auto const known = bounded.run({.size = 20'000, .seed = 7});
  CHECK(known.diagnosis().bounded());
  CHECK(sy::more_samples(known.probability(event), known.diagnosis(), 1e-3).known);
  CHECK(bounded.estimate({.size = 20'000, .seed = 7}, sy::health()).get<0>().bounded());
  // Few groups, equal weights, no event.
  sy::pipeline const pipe{law::draw_normal, law::read_one};
  auto const sample = pipe.run({.size = 5000, .seed = 8});
  sy::estimate const never = sample.probability([](double x) { return x > 50.0; });
  CHECK(holds(sy::more_samples(never, sample.diagnosis(), 1e-3).text, "the error bar itself is broken"));
  CHECK(holds(sy::more_samples(sample.shortest_interval(itself, 0.5).lower, sample.diagnosis(), 1e-3).text,
              "few groups"));
  auto const equal = sy::weigh(std::vector<double>(sample.states().begin(), sample.states().end()),
                               [](double) { return sy::likelihood{1.0}; });
  CHECK(holds(sy::more_samples(equal.expectation(itself), equal.diagnosis(), 1e-3).text, "too few weights differ"));
  for (double const bad : {0.0, -1.0, law::not_a_number(), law::infinity()})
    CHECK(holds(said<sy::bad_argument>([&] { (void)sy::more_samples(e, heavy.diagnosis(), bad); }),
                "must be a positive finite number"));
}
