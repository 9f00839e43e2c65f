// SPDX-License-Identifier: BSL-1.0
// One sample, other questions: reweighed, without a reading, under the prior, given
// an event. Base weights stay, likelihood columns come and go, states are shared.

#include <doctest/doctest.h>

#include <cmath>
#include <cstdint>
#include <limits>
#include <optional>
#include <string>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::close;
using law::holds;
using law::said;

namespace {

auto const reading = [](double y, double sd) {
  return [y, sd](double x) {
    double const z = (y - x) / sd;
    return sy::log_likelihood{-0.5 * z * z - std::log(sd) - 0.918938533204672742};
  };
};
auto const two_gauges = sy::together(sy::named("north", reading(1.0, 0.5)), sy::named("south", reading(0.4, 0.8)));
sy::pipeline const model{law::draw_normal, two_gauges};
sy::pipeline const north_only{law::draw_normal, reading(1.0, 0.5)};

bool right(double x) { return x > 0.0; }

}  // namespace

TEST_CASE("reweigh answers as a run with that weighter would, without a new run") {
  sy::plan const plan{.size = 5000, .seed = 1};
  auto const sample = model.run(plan);
  auto const again = sample.reweigh(reading(1.0, 0.5));
  auto const direct = north_only.run(plan);
  CHECK((law::bits(again.expectation(law::itself)) == law::bits(direct.expectation(law::itself))));
  CHECK((law::bits(again.log_evidence()) == law::bits(direct.log_evidence())));
  CHECK(again.states().data() == sample.states().data());
  CHECK(again.sampler_calls() == sample.sampler_calls());
  CHECK(again.names().size() == 1);
  CHECK(sample.names().size() == 2);  // the sample itself is as it was
}

TEST_CASE("only and without take readings away by name") {
  sy::plan const plan{.size = 5000, .seed = 2};
  auto const sample = model.run(plan);
  auto const direct = law::bits(north_only.run(plan).expectation(law::itself));
  CHECK((law::bits(sample.only("north").expectation(law::itself)) == direct));
  CHECK((law::bits(sample.without("south").expectation(law::itself)) == direct));
  CHECK((law::bits(sample.only("north").log_evidence()) == law::bits(north_only.run(plan).log_evidence())));
  CHECK(sample.only("north").names()[0] == "north");
  CHECK(sample.without("south").without("north").expectation(law::itself).effective_size == doctest::Approx(5000.0));
  CHECK((law::bits(sample.without("south").only("north").expectation(law::itself)) == direct));
}

TEST_CASE("a reading's name that is not there is refused with those that are") {
  auto const sample = model.run({.size = 100, .seed = 3});
  CHECK(said<sy::bad_name>([&] { sample.without("west"); }) ==
        "without: there is no reading 'west'; this sample has 'north', 'south'");
  CHECK(said<sy::bad_name>([&] { sample.only("North"); }) ==
        "only: there is no reading 'North'; this sample has 'north', 'south'");
  CHECK(said<sy::bad_name>([&] { sample.log_likelihoods("x"); }) ==
        "log_likelihoods: there is no reading 'x'; this sample has 'north', 'south'");
  CHECK(said<sy::bad_name>([&] { sample.before().only("north"); }) == "only: there is no reading 'north'; this sample has none");
  CHECK(said<sy::bad_name>([&] { sample.only("north").without("south"); }) ==
        "without: there is no reading 'south'; this sample has 'north'");
}

TEST_CASE("before is the prior: base weights stay") {
  auto const sample = model.run({.size = 20'000, .seed = 4});
  auto const prior = sample.before();
  CHECK(law::errors_off(prior.expectation(law::itself), 0.0) < 5.0);
  CHECK(prior.expectation(law::itself).effective_size == doctest::Approx(20'000.0));
  CHECK(prior.log_evidence().value == 0.0);
  CHECK(prior.log_evidence().standard_error == 0.0);
  CHECK((law::bits(prior.reweigh(two_gauges).expectation(law::itself)) == law::bits(sample.expectation(law::itself))));

  std::vector<double> const states{1.0, 2.0, 3.0};
  auto const weighed = sy::weigh(states, [](double x) { return sy::likelihood{x}; }, {.prior_weights = {1.0, 1.0, 2.0}});
  CHECK(close(weighed.before().expectation(law::itself).value, 9.0 / 4.0));
  CHECK(close(weighed.reweigh([](double) { return sy::likelihood{5.0}; }).expectation(law::itself).value, 9.0 / 4.0));
}

TEST_CASE("given an event: the posterior and the prior within it, and the evidence of the reading given the event") {
  // X ~ N(0, 1), read as 1 with sd 0.5; given X > 0. Closed form by the error function.
  auto const phi = [](double z) { return 0.5 * std::erfc(-z / std::sqrt(2.0)); };
  double const inside = phi(0.8 / std::sqrt(0.2));                    // P(X > 0 | reading)
  double const log_all = -0.5 * 1.0 / 1.25 - 0.5 * std::log(2.0 * 3.14159265358979323846 * 1.25);
  double const log_given = log_all + std::log(inside) - std::log(0.5);
  auto const sample = north_only.run({.size = 50'000, .seed = 5});
  auto const positive = sample.given(right);
  double const a = -0.8 / std::sqrt(0.2), mills = std::exp(-0.5 * a * a) / std::sqrt(2.0 * 3.14159265358979323846) / inside;
  CHECK(law::errors_off(positive.expectation(law::itself), 0.8 + std::sqrt(0.2) * mills) < 5.0);
  CHECK(law::errors_off(positive.before().expectation(law::itself), std::sqrt(2.0 / 3.14159265358979323846)) < 5.0);
  CHECK(law::errors_off(positive.log_evidence(), log_given) < 5.0);
  CHECK(law::errors_off(sample.log_evidence(), log_all) < 5.0);
  CHECK(positive.probability(right).always_seen());
  CHECK(positive.states().data() == sample.states().data());
  CHECK(positive.size() == sample.size());

  // The same by hand, on the same states: given twice is given both.
  auto const middle = positive.given([](double x) { return x < 1.0; });
  double top = 0.0, bottom = 0.0, base = 0.0;
  for (std::size_t i = 0; i < sample.size(); ++i) {
    double const x = sample.states()[i];
    if (!(x > 0.0 && x < 1.0)) continue;
    double const w = std::exp(sample.log_weights()[i]);
    top += w * x;
    bottom += w;
    base += 1.0;
  }
  CHECK(close(middle.expectation(law::itself).value, top / bottom, 1e-10));
  CHECK(close(middle.log_evidence().value, std::log(bottom / base), 1e-10));
}

TEST_CASE("given keeps the readings' columns apart, and reweighing keeps what is given") {
  sy::plan const plan{.size = 4000, .seed = 6};
  auto const sample = model.run(plan);
  auto const part = sample.given(right);
  CHECK(close(part.without("south").expectation(law::itself), sample.without("south").given(right).expectation(law::itself), 1e-14));
  CHECK(close(part.reweigh(reading(1.0, 0.5)).log_evidence(), north_only.run(plan).given(right).log_evidence(), 1e-12));
  CHECK(part.log_likelihoods("north")[7] == sample.log_likelihoods("north")[7]);
  auto const plain = north_only.run(plan).given(right);
  CHECK(plain.log_likelihoods("likelihood")[7] == sample.log_likelihoods("north")[7]);
  CHECK(close(plain.before().reweigh(reading(1.0, 0.5)).expectation(law::itself), plain.expectation(law::itself), 1e-14));
}

TEST_CASE("runs that failed are in no event: given one, they are no part of the evidence") {
  auto const fails = [](sy::draws& draws) -> std::optional<double> {
    double const x = draws.normal();
    if (draws.chance(0.25)) return std::nullopt;
    return x;
  };
  sy::plan const plan{.size = 30'000, .seed = 7, .on_failure = sy::failures::set_aside};
  auto const sample = sy::pipeline{fails, [](double) { return sy::likelihood{1.0}; }}.run(plan);
  CHECK(law::errors_off(sample.log_evidence(), std::log(0.75)) < 5.0);  // failed runs are drawn with weight zero
  CHECK(law::errors_off(sample.before().log_evidence(), std::log(0.75)) < 5.0);
  CHECK(sample.given(right).log_evidence().value == doctest::Approx(0.0));
  CHECK(sample.given(right).diagnosis().failed() == sample.diagnosis().failed());
}

TEST_CASE("an event that nothing meets is refused like a reading that nothing explains") {
  auto const sample = model.run({.size = 100, .seed = 8});
  std::string const text = said<sy::no_likelihood>([&] { sample.given([](double x) { return x > 99.0; }); });
  CHECK(holds(text, "given: none of the 100 samples drawn can be weighed above zero"));
  std::string const other =
      said<sy::no_likelihood>([&] { sample.reweigh([](double) { return sy::log_likelihood{-law::infinity()}; }); });
  CHECK(holds(other, "reweigh: none of the 100 samples"));
  CHECK(sample.expectation(law::itself).effective_size > 0.0);
}

TEST_CASE("a handle is cheap: copies share the states, and each stands when the others are gone") {
  std::optional<sy::weighted_sample<double>> first = model.run({.size = 1000, .seed = 9});
  auto const copy = *first;
  auto const prior = first->before();
  CHECK(copy.states().data() == first->states().data());
  auto const before = law::bits(copy.expectation(law::itself));
  first.reset();
  CHECK((law::bits(copy.expectation(law::itself)) == before));
  CHECK(prior.states().data() == copy.states().data());
}

TEST_CASE("columns of numbers to look at") {
  auto const sample = model.run({.size = 50, .seed = 10});
  CHECK(sample.log_weights().size() == 50);
  auto const all = sample.values([](double x) { return 2.0 * x; });
  for (std::size_t i = 0; i < 50; ++i) CHECK(all[i] == 2.0 * sample.states()[i]);
  auto const part = sample.given(right).values(law::itself);
  for (std::size_t i = 0; i < 50; ++i) CHECK(part[i] == (right(sample.states()[i]) ? sample.states()[i] : 0.0));
  CHECK(sample.given(right).values(law::itself, true)[0] == sample.states()[0]);
}
