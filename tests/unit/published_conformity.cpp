// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Conformity of a measured item: JCGM 106:2012 and its successor JCGM GUM-5:2026,
// plain lambda weighters, within 5 reported standard errors of the exact value.

#include <doctest/doctest.h>

#include <cmath>

#include <boost/math/distributions/gamma.hpp>

#include <steelyard/core.hpp>

#include "law_questions.hpp"

namespace sy = steelyard;
using law::errors_off;

namespace {

/// A normal reading with its constants.
auto read(double reading, double sd) {
  return [=](double truth) {
    double const z = (reading - truth) / sd;
    return sy::log_likelihood{-0.5 * z * z - std::log(sd) - 0.91893853320467274178};
  };
}

}  // namespace

TEST_CASE("JCGM GUM-5:2026, example 10: suspended particulate against a limit of 0.2 mg/m3") {
  // Prior lognormal(mu -2.325, sigma 0.434), reading 0.225 with normal sd 0.01575. Published risk 0.11.
  auto const prior = [](sy::draws& draws) { return std::exp(draws.normal(-2.325, 0.434)); };
  auto const conforms = [](double y) { return y <= 0.2; };
  auto const sample = sy::pipeline{prior, read(0.225, 0.01575)}.run({.size = 400'000, .seed = 1});
  auto const risk = sample.probability(conforms);
  CHECK(errors_off(risk, 0.113340355517) < 5.0);
  CHECK(risk.standard_error < 0.005);
  CHECK(errors_off(sample.log_evidence(), std::log(0.694812783717)) < 5.0);
  auto const moments = sample.moments(law::itself);
  CHECK(errors_off(moments.mean, 0.219034627307) < 5.0);
  CHECK(errors_off(moments.sd, 0.015745976466) < 5.0);
  CHECK(errors_off(sample.before().probability(conforms), 0.950401652133) < 5.0);
}

TEST_CASE("JCGM 106:2012, 9.5.4: ball bearings, global and specific risks") {
  // Prior gamma(shape 4, scale 1/4) micrometre, limit 2, normal reading with u 0.25.
  boost::math::gamma_distribution<double> const law_of_bearings(4.0, 0.25);
  struct inspected {
    double y, reading;
  };
  auto const inspect = [&](sy::draws& draws) {
    double const y = draws.from(law_of_bearings);
    return inspected{y, draws.normal(y, 0.25)};
  };
  auto const any = [](inspected const&) { return sy::likelihood{1.0}; };
  auto const all = sy::pipeline{inspect, any}.run({.size = 400'000, .seed = 1});
  CHECK(errors_off(all.probability([](inspected const& i) { return i.y > 2.0; }), 0.0423801119917) < 5.0);
  CHECK(errors_off(all.probability([](inspected const& i) { return i.y > 2.0 && i.reading <= 2.0; }), 0.00801911188429) < 5.0);
  CHECK(errors_off(all.probability([](inspected const& i) { return i.y <= 2.0 && i.reading > 2.0; }), 0.0174445692298) < 5.0);
  auto const accepted = [](inspected const& i) { return i.reading <= 2.0; };
  CHECK(errors_off(all.probability(accepted), 0.948194430663) < 5.0);
  // The risk among accepted ones is the consumer's, given acceptance.
  CHECK(errors_off(all.given(accepted).probability([](inspected const& i) { return i.y > 2.0; }), 0.00801911188429 / 0.948194430663) < 5.0);

  // One reading of 1.9.
  auto const prior = [&](sy::draws& draws) { return draws.from(law_of_bearings); };
  auto const sample = sy::pipeline{prior, read(1.9, 0.25)}.run({.size = 400'000, .seed = 2});
  CHECK(errors_off(sample.probability([](double y) { return y <= 2.0; }), 0.840134757118) < 5.0);
  auto const moments = sample.moments(law::itself);
  CHECK(errors_off(moments.mean, 1.75875507654) < 5.0);
  CHECK(errors_off(moments.sd, 0.242335422583) < 5.0);
  CHECK(errors_off(sample.log_evidence(), std::log(0.169034295000)) < 5.0);
}

TEST_CASE("JCGM 106:2012, clause 7: a flat prior") {
  // From memory, reproduced from the stated inputs: Phi(1.4), and the viscosity between two limits.
  auto const flat = [](double from, double to) { return [=](sy::draws& draws) { return draws.uniform(from, to); }; };
  auto const below = sy::pipeline{flat(-5.97, -4.97), read(-5.47, 0.05)}.run({.size = 200'000, .seed = 1});
  CHECK(errors_off(below.probability([](double y) { return y <= -5.40; }), 0.919243340766) < 5.0);
  auto const viscosity = sy::pipeline{flat(-4.4, 31.6), read(13.6, 1.8)}.run({.size = 200'000, .seed = 2});
  CHECK(errors_off(viscosity.probability([](double y) { return y >= 12.5 && y <= 16.3; }), 0.662629786495) < 5.0);
}
