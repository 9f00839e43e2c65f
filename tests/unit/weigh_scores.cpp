// SPDX-License-Identifier: BSL-1.0
// Scores: their arithmetic, what they are refused for, and how several readings
// become one weighter.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <limits>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace sy = steelyard;
using law::holds;
using law::said;

namespace {

std::vector<double> const three{1.0, 2.0, 3.0};

struct boiler {
  double pressure;
  double level;
};
std::vector<boiler> const boilers{{1.0, 0.5}, {2.0, 0.1}, {3.0, 0.9}};

auto const gauge = [](boiler const& b) { return sy::log_likelihood{-b.pressure}; };
auto const meter = [](boiler const& b) { return sy::likelihood{b.level}; };

}  // namespace

TEST_CASE("independent readings: logarithms add, likelihoods multiply") {
  CHECK((sy::log_likelihood{-1.5} + sy::log_likelihood{0.25}).value == -1.25);
  CHECK((sy::likelihood{0.5} * sy::likelihood{0.25}).value == 0.125);
}

TEST_CASE("a likelihood and its logarithm weigh alike") {
  auto const plain = sy::weigh(three, [](double x) { return sy::likelihood{x}; });
  auto const logs = sy::weigh(three, [](double x) { return sy::log_likelihood{std::log(x)}; });
  for (std::size_t i = 0; i < 3; ++i) CHECK(law::close(plain.log_weights()[i], logs.log_weights()[i], 1e-15));
  CHECK(law::close(plain.expectation(law::itself).value, 14.0 / 6.0));
  auto const wrapped = sy::weigh(three, sy::as_likelihood([](double x) { return x; }));
  CHECK(law::bits(wrapped.expectation(law::itself)) == law::bits(plain.expectation(law::itself)));
  auto const wrapped_log = sy::weigh(three, sy::as_log_likelihood([](double x) { return static_cast<float>(x); }));
  CHECK(wrapped_log.log_weights()[2] == 3.0);
  auto const member = sy::weigh(boilers, sy::as_log_likelihood(&boiler::pressure));
  CHECK(member.log_weights()[1] == 2.0);
}

TEST_CASE("minus infinity and likelihood zero mean impossible") {
  double const lowest = std::numeric_limits<double>::lowest();
  auto const logs = sy::weigh(three, [](double x) { return sy::log_likelihood{x < 2.5 ? -law::infinity() : 0.0}; });
  CHECK(logs.log_weights()[0] == lowest);
  CHECK(logs.log_weights()[2] == 0.0);
  CHECK(logs.expectation(law::itself).value == 3.0);
  CHECK(logs.diagnosis().share_of_zeros() == 2.0 / 3.0);
  auto const plain = sy::weigh(three, [](double x) { return sy::likelihood{x < 2.5 ? 0.0 : 1.0}; });
  CHECK(plain.log_weights()[1] == lowest);
}

TEST_CASE("a score that is no number, infinite or negative is refused with the sample and the rule") {
  auto const refusal = [](auto score) {
    return said<sy::bad_weight>([&] { sy::weigh(three, [&](double x) { return score(x); }); });
  };
  auto const allowed = "allowed is a finite log-likelihood or minus infinity, or a finite likelihood of zero or more";
  std::string const not_a_number = refusal([](double x) { return sy::log_likelihood{x > 1.5 ? law::not_a_number() : 0.0}; });
  CHECK(holds(not_a_number, "weigh: sample 1 is refused: its log-likelihood is not a number (NaN)"));
  CHECK(holds(not_a_number, allowed));
  CHECK(holds(refusal([](double x) { return sy::log_likelihood{x > 2.5 ? law::infinity() : 0.0}; }),
              "weigh: sample 2 is refused: its log-likelihood is plus infinity"));
  CHECK(holds(refusal([](double) { return sy::likelihood{law::not_a_number()}; }),
              "weigh: sample 0 is refused: its likelihood is not a number (NaN)"));
  CHECK(holds(refusal([](double) { return sy::likelihood{law::infinity()}; }), "its likelihood is infinite"));
  CHECK(holds(refusal([](double x) { return sy::likelihood{2.5 - x}; }),
              "weigh: sample 2 is refused: its likelihood is negative (-0.5"));

  sy::pipeline const pipe{law::draw_normal, [](double x) { return sy::log_likelihood{x > 3.0 ? law::not_a_number() : 0.0}; }};
  for (unsigned threads : {1u, 2u}) {
    sy::plan const plan{.size = 20'000, .seed = 1, .threads = threads};
    std::string const kept = said<sy::bad_weight>([&] { pipe.run(plan); });
    CHECK(holds(kept, "is refused: its log-likelihood is not a number (NaN)"));
    CHECK(kept == said<sy::bad_weight>([&] { pipe.expectation(plan, law::itself); }));
  }
}

TEST_CASE("scores that add up beyond a double are refused") {
  auto const far = [](boiler const&) { return sy::log_likelihood{-1.2e308}; };
  auto const text =
      said<sy::bad_weight>([&] { sy::weigh(boilers, sy::together(sy::named("a", far), sy::named("b", far))); });
  CHECK(holds(text, "sample 0 is refused: its log-likelihoods add up beyond the range of a double"));
}

TEST_CASE("together: log-likelihoods add, and each reading keeps its column") {
  auto const both = sy::weigh(boilers, sy::together(sy::named("gauge", gauge), sy::named("meter", meter)));
  CHECK(both.names().size() == 2);
  CHECK(both.names()[0] == "gauge");
  CHECK(both.names()[1] == "meter");
  for (std::size_t i = 0; i < boilers.size(); ++i) {
    CHECK(both.log_likelihoods("gauge")[i] == -boilers[i].pressure);
    CHECK(law::close(both.log_likelihoods("meter")[i], std::log(boilers[i].level), 1e-15));
    CHECK(both.log_weights()[i] == both.log_likelihoods("gauge")[i] + both.log_likelihoods("meter")[i]);
  }
  CHECK(both.names()[0] == sy::together(sy::named("gauge", gauge)).name(0));
}

TEST_CASE("together of togethers brings all their items") {
  auto const inner = sy::together(sy::named("gauge", gauge), sy::named("meter", meter));
  auto const outer = sy::together(inner, sy::named("second gauge", gauge));
  static_assert(decltype(outer)::size == 3);
  auto const sample = sy::weigh(boilers, outer);
  CHECK(sample.names()[1] == "meter");
  CHECK(law::close(sample.log_weights()[2], sample.log_likelihoods("meter")[2] - 6.0, 1e-15));
}

TEST_CASE("a reading that rules a state out rules it out for all") {
  auto const never = [](boiler const& b) { return sy::likelihood{b.pressure > 1.5 ? 1.0 : 0.0}; };
  auto const sample = sy::weigh(boilers, sy::together(sy::named("gauge", gauge), sy::named("limit", never)));
  CHECK(sample.log_weights()[0] == std::numeric_limits<double>::lowest());
  CHECK(sample.log_likelihoods("gauge")[0] == -1.0);
  CHECK(sample.without("limit").log_weights()[0] == -1.0);
}

TEST_CASE("two readings of one name are refused, with the names") {
  auto const text = said<sy::bad_name>(
      [] { sy::together(sy::named("gauge", gauge), sy::named("meter", meter), sy::named("gauge", meter)); });
  CHECK(holds(text, "together: two readings are called 'gauge' among 'gauge', 'meter', 'gauge'"));
  CHECK(holds(text, "each needs a name of its own"));
}

TEST_CASE("a plain weighter has one column, called likelihood, or by its own name") {
  CHECK(sy::weigh(boilers, gauge).names()[0] == "likelihood");
  CHECK(sy::weigh(boilers, sy::named("gauge", gauge)).names()[0] == "gauge");
  CHECK(sy::weigh(boilers, sy::bounded(sy::named("gauge", gauge), 0.0)).names()[0] == "gauge");
}

TEST_CASE("a readout carries its name and unit and is called like the function in it") {
  sy::readout const pressure{"pressure", "bar", &boiler::pressure};
  CHECK(pressure.name() == "pressure");
  CHECK(pressure.unit() == "bar");
  CHECK(pressure(boilers[2]) == 3.0);
  auto const sample = sy::weigh(boilers, gauge);
  CHECK(law::bits(sample.expectation(pressure)) == law::bits(sample.expectation(&boiler::pressure)));
}

TEST_CASE("bounded: a score above the declared bound is refused, one at the bound passes") {
  auto const sample = sy::weigh(boilers, sy::bounded(gauge, -1.0));
  CHECK(sample.log_weights()[0] == -1.0);
  auto const rounding = sy::bounded([](boiler const&) { return sy::log_likelihood{-1.0 + 1e-13}; }, -1.0);
  CHECK(sy::weigh(boilers, rounding).size() == 3);
  auto const text = said<sy::bad_weight>([] { sy::weigh(boilers, sy::bounded(gauge, -1.5)); });
  CHECK(holds(text, "sample 0 is refused: bounded: a log-likelihood of -1"));
  CHECK(holds(text, "exceeds the declared bound -1.5"));
  for (double const bound : {law::infinity(), -law::infinity(), law::not_a_number()})
    CHECK(said<sy::bad_argument>([&] { sy::bounded(gauge, bound); }) ==
          "bounded: the bound must be a finite logarithm");
  CHECK(sy::together(sy::named("a", sy::bounded(gauge, 2.0)), sy::named("b", sy::bounded(meter, 0.5))).log_bound() == 2.5);
}
