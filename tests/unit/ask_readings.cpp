// SPDX-License-Identifier: BSL-1.0
// Questions to readings, against conjugate models. Normal, negative binomial and chi-square tails: Boost.Math.
// legs: plain
#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstddef>
#include <string>

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/negative_binomial.hpp>
#include <boost/math/distributions/normal.hpp>

#include <steelyard/ask.hpp>
#include <steelyard/core.hpp>
#include <steelyard/instrument/instruments.hpp>

namespace sy = steelyard;

namespace {

auto const itself = [](double x) { return x; };
auto const prior = [](sy::draws& d) { return d.normal(); };

/// Posterior of a standard normal unknown after readings (value, sd).
struct posterior {
  double mean = 0.0, variance = 1.0;
  posterior& read(double y, double sd) {
    double const precision = 1.0 / variance + 1.0 / (sd * sd);
    mean = (mean / variance + y / (sd * sd)) / precision;
    variance = 1.0 / precision;
    return *this;
  }
};

double two_sided(posterior const& p, double y, double sd) {
  boost::math::normal_distribution<double> const shown(p.mean, std::sqrt(p.variance + sd * sd));
  double const lower = cdf(shown, y), upper = cdf(complement(shown, y));
  return 2.0 * (lower < upper ? lower : upper);
}

bool near(sy::estimate const& e, double exact) { return std::abs(e.value - exact) < 5.0 * e.standard_error; }

}  // namespace

TEST_CASE("how far each reading moved the mean is the difference of two conjugate posteriors") {
  auto const weighter = sy::together(sy::reading("a", 0.9, itself, sy::normal_noise(0.5)),
                                     sy::reading("b", 0.2, itself, sy::normal_noise(1.0)));
  auto const sample = sy::pipeline{prior, weighter}.run({.size = 40'000, .seed = 1});
  double const both = posterior{}.read(0.9, 0.5).read(0.2, 1.0).mean;
  auto const moved = sy::decided(sample, itself);
  REQUIRE(moved.size() == 2);
  CHECK(moved[0].name == "a");
  CHECK(near(moved[0].moved, both - posterior{}.read(0.2, 1.0).mean));
  CHECK(near(moved[1].moved, both - posterior{}.read(0.9, 0.5).mean));
  CHECK(moved[0].moved.verdict() == sy::verdict::sound);
  CHECK(moved[0].effective_size_without > moved[0].effective_size_with);
  CHECK(moved[0].effective_size_with == sample.diagnosis().effective_size());
  CHECK(to_string(moved[0]).find("Reading 'a' moved the answer by") == 0);
  CHECK_THROWS_AS((void)sy::decided(sample.before(), itself), sy::bad_argument);
}

TEST_CASE("the error of that difference is right from both sides") {
  auto const weighter = sy::together(sy::reading("a", 0.9, itself, sy::normal_noise(0.5)),
                                     sy::reading("b", 0.2, itself, sy::normal_noise(1.0)));
  double const exact = posterior{}.read(0.9, 0.5).read(0.2, 1.0).mean - posterior{}.read(0.2, 1.0).mean;
  double sum = 0.0;
  int const repeats = 1000;
  for (int r = 1; r <= repeats; ++r) {
    auto const moved = sy::decided(sy::pipeline{prior, weighter}.run({.size = 500, .seed = r}), itself)[0].moved;
    sum += std::pow((moved.value - exact) / moved.standard_error, 2) / repeats;
  }
  CHECK(sum == doctest::Approx(1.0).epsilon(5.0 * std::sqrt(2.0 / repeats)));  // mean z^2 has variance about 2/n
}

TEST_CASE("the chance of a reading under the others is the predictive tail, and a reading too far out is a finding") {
  auto const weighter = sy::together(sy::reading("a", 0.9, itself, sy::normal_noise(0.5)),
                                     sy::reading("far", -2.6, itself, sy::normal_noise(0.6)),
                                     sy::reading("b", 0.7, itself, sy::normal_noise(1.0)));
  auto const sample = sy::pipeline{prior, weighter}.run({.size = 100'000, .seed = 1});
  auto const agreed = sy::agree(sample, weighter);
  REQUIRE(agreed.size() == 3);
  CHECK(near(agreed[0].chance, two_sided(posterior{}.read(-2.6, 0.6).read(0.7, 1.0), 0.9, 0.5)));
  CHECK(near(agreed[1].chance, two_sided(posterior{}.read(0.9, 0.5).read(0.7, 1.0), -2.6, 0.6)));
  CHECK(near(agreed[2].chance, two_sided(posterior{}.read(0.9, 0.5).read(-2.6, 0.6), 0.7, 1.0)));
  CHECK_FALSE(agreed.holds());
  REQUIRE(agreed.findings().size() >= 1);
  CHECK(to_string(agreed).find("Reading 'far' is hard to believe") != std::string::npos);
  CHECK_FALSE(agreed[2].doubtful);
}

TEST_CASE("counts are randomised between the tails below and up to the count") {
  // Gamma(2, rate 0.5) mean, one count: without it the count is negative binomial, r = 2, p = rate/(rate + 1) [any textbook]
  auto const shape_two = [](sy::draws& d) { return d.exponential(0.5) + d.exponential(0.5); };
  auto const weighter = sy::reading("pulses", 9, itself, sy::poisson_count());
  auto const sample = sy::pipeline{shape_two, weighter}.run({.size = 50'000, .seed = 1});
  boost::math::negative_binomial_distribution<double> const shown(2.0, 0.5 / 1.5);
  double const least = 2.0 * cdf(complement(shown, 9.0)), most = 2.0 * cdf(complement(shown, 8.0));
  sy::estimate const chance = sy::agree(sample, weighter)[0].chance;
  CHECK(chance.value > least - 5.0 * chance.standard_error);
  CHECK(chance.value < most + 5.0 * chance.standard_error);
  CHECK(sy::agree(sample, weighter, {.seed = 2})[0].chance.value != chance.value);  // another share of the ties
}

TEST_CASE("a censored reading has the chance of what it says, and a rounded one counts its own step as a tie") {
  auto const weighter = sy::together(sy::reading("over", sy::over(1.0), itself, sy::normal_noise(0.5)),
                                     sy::reading("rounded", 0.5, itself, sy::rounded(0.5, sy::normal_noise(0.5))));
  auto const sample = sy::pipeline{prior, weighter}.run({.size = 50'000, .seed = 1});
  auto const agreed = sy::agree(sample, weighter);
  auto const without_over = sample.without("over");
  boost::math::normal_distribution<double> const unit;
  sy::estimate const by_hand =
      without_over.expectation([&](double x) { return cdf(complement(unit, (1.0 - x) / 0.5)); });
  CHECK(agreed[0].chance.value == doctest::Approx(by_hand.value).epsilon(1e-9));
  // Half the chance, or what it lacks of 1, lies between the tail below the step and that with the step in it.
  auto const without_rounded = sample.without("rounded");
  auto const below = [&](double edge) {
    return without_rounded.expectation([&unit, edge](double x) { return cdf(unit, (edge - x) / 0.5); }).value;
  };
  double const half = 0.5 * agreed[1].chance.value, least = below(0.25), most = below(0.75);
  CHECK(((half >= least && half <= most) || (1.0 - half >= least && 1.0 - half <= most)));
}

TEST_CASE("where simulator and instruments are right, the chances of counts and rounded readings are spread evenly") {
  std::size_t const repeats = 300;
  std::array<std::array<double, 5>, 2> seen{};
  auto const start = [](sy::draws& d) { return d.uniform(1.0, 5.0); };
  auto const gauge = sy::rounded(0.5, sy::normal_noise(0.6));
  for (std::size_t r = 0; r < repeats; ++r) {
    sy::draws world(sy::count(r + 1), 0, sy::purpose::check);
    double const truth = start(world);
    auto const weighter = sy::together(sy::reading("pulses", sy::poisson_count().draw(truth, world), itself, sy::poisson_count()),
                                       sy::reading("gauge", gauge.draw(truth, world), itself, gauge));
    auto const agreed = sy::agree(sy::pipeline{start, weighter}.run({.size = 300, .seed = r + 1}), weighter, {.seed = r + 1});
    for (std::size_t k = 0; k < 2; ++k)
      ++seen[k][std::min<std::size_t>(static_cast<std::size_t>(5.0 * agreed[k].chance.value), 4)];
  }
  for (auto const& cells : seen) {
    double chi_square = 0.0;
    for (double const n : cells) chi_square += std::pow(n - 0.2 * repeats, 2) / (0.2 * repeats);
    boost::math::chi_squared_distribution<double> const law(4.0);
    CAPTURE(chi_square);
    CHECK(cdf(complement(law, chi_square)) > 1e-6);
  }
}

TEST_CASE("the next reading of an instrument has the predictive law") {
  auto const weighter = sy::reading("a", 0.9, itself, sy::normal_noise(0.5));
  auto const sample = sy::pipeline{prior, weighter}.run({.size = 100'000, .seed = 1});
  auto const next = sy::next_reading(sample, itself, sy::normal_noise(0.3));
  posterior const p = posterior{}.read(0.9, 0.5);
  boost::math::normal_distribution<double> const shown(p.mean, std::sqrt(p.variance + 0.09));
  CHECK(near(next.expectation(itself), p.mean));
  CHECK(near(next.probability([](double y) { return y > 1.2; }), cdf(complement(shown, 1.2))));
  auto const range = next.interval(itself, 0.9);
  CHECK(near(range.lower, quantile(shown, 0.05)));
  CHECK(near(range.upper, quantile(shown, 0.95)));
  CHECK(next.drawn() == sample.drawn());
  auto const shares = next.histogram(itself, sy::bins({-3.0, 0.5, 1.0, 4.0}));
  CHECK(near(shares.probability(1), cdf(shown, 1.0) - cdf(shown, 0.5)));
  // The same faked readings whatever the threads, and others from another seed.
  auto const threaded = sy::next_reading(sy::pipeline{prior, weighter}.run({.size = 100'000, .seed = 1, .threads = 2}), itself,
                                         sy::normal_noise(0.3));
  CHECK(threaded.expectation(itself).value == next.expectation(itself).value);
  CHECK(sy::next_reading(sample, itself, sy::normal_noise(0.3), {.seed = 2}).expectation(itself).value !=
        next.expectation(itself).value);
}

TEST_CASE("a reading off its instrument's scale by 12 orders of magnitude is a finding, in one pass and kept") {
  auto const wide = [](sy::draws& d) { return d.uniform(0.0, 1e13); };
  auto const weighter = sy::reading("gauge", 2e12, itself, sy::normal_noise(0.5));
  auto const finds = [](sy::diagnosis const& d) {
    for (sy::finding const& f : d.findings())
      if (f.kind == sy::finding_kind::reading_doubt && f.text.find("'gauge'") != std::string::npos) return true;
    return false;
  };
  CHECK(finds(sy::pipeline{wide, weighter}.run({.size = 2'000}).diagnosis()));
  CHECK(finds(sy::pipeline{wide, weighter}.estimate({.size = 2'000}, sy::log_evidence()).diagnosis()));
}
