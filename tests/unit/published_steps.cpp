// SPDX-License-Identifier: BSL-1.0
// legs: plain
// Single steps of a published filter: what one reading tells about a level that has moved since the last one.

#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <vector>

#include <boost/math/distributions/chi_squared.hpp>

#include <steelyard/steelyard.hpp>

#include "published_data.hpp"

namespace sy = steelyard;

TEST_CASE("flow of the Nile at Aswan, local level: the step of each year from the exact state of the year before") {
  // Durbin & Koopman, Time Series Analysis by State Space Methods, 2nd ed. 2012, ch. 2: y = a + N(0, 15099), a moves by
  // N(0, 1469.1) a year; a_1871 ~ N(1000, 300^2). The exact filter stands in the file.
  auto const table = published::read("nile_filter_reference.csv");
  auto const flow = table.numbers("flow"), mean = table.numbers("filt_mean"), sd = table.numbers("filt_sd"),
             increment = table.numbers("loglik_inc");
  REQUIRE(flow.size() == 100);
  double z2_mean = 0.0, z2_evidence = 0.0, total = 0.0, variance = 0.0;
  for (std::size_t t = 0; t < flow.size(); ++t) {
    CAPTURE(t);
    double const before = t == 0 ? 1000.0 : mean[t - 1];
    double const spread = t == 0 ? 300.0 : std::sqrt(sd[t - 1] * sd[t - 1] + 1469.1);
    auto const level = [=](sy::draws& draws) { return draws.normal(before, spread); };
    auto const itself = [](double x) { return x; };
    sy::pipeline const step{level, sy::reading("flow", flow[t], itself, sy::normal_noise(std::sqrt(15099.0)))};
    auto const answers =
        step.estimate({.size = 4'000, .seed = 1 + t}, sy::expectation(itself), sy::log_evidence(), sy::moments(itself));
    sy::estimate const& its_mean = answers.get<0>();
    sy::estimate const& evidence = answers.get<1>();
    CHECK(std::abs(its_mean.value - mean[t]) < 5.0 * its_mean.standard_error);
    CHECK(std::abs(evidence.value - increment[t]) < 5.0 * evidence.standard_error);
    CHECK(std::abs(answers.get<2>().sd.value - sd[t]) < 5.0 * answers.get<2>().sd.standard_error);
    z2_mean += std::pow((its_mean.value - mean[t]) / its_mean.standard_error, 2);
    z2_evidence += std::pow((evidence.value - increment[t]) / evidence.standard_error, 2);
    total += evidence.value;
    variance += evidence.standard_error * evidence.standard_error;
  }
  // A hundred squares of standard normal numbers leave these limits one time in ten thousand.
  boost::math::chi_squared const hundred(100.0);
  double const low = quantile(hundred, 0.5e-4), high = quantile(complement(hundred, 0.5e-4));
  CHECK(z2_mean > low);
  CHECK(z2_mean < high);
  CHECK(z2_evidence > low);
  CHECK(z2_evidence < high);
  CHECK(std::abs(total - -639.2565658146258) < 5.0 * std::sqrt(variance));
}
