// SPDX-License-Identifier: BSL-1.0
// Score and draw of every instrument and modifier belong together: fakes are
// spread as the scores say, and all that can be shown adds up to 1.
// A chance below 1e-6 fails; seeds are the numbers of the cases.

#include <array>
#include <cmath>
#include <cstdint>
#include <limits>
#include <vector>

#include <doctest/doctest.h>

#include <steelyard/instrument/instruments.hpp>

#include "instrument_check.hpp"

namespace sy = steelyard;
using instrument_check::chance_together;
using instrument_check::worst_mass;
using instrument_check::worst_sum;

namespace {

double const least_chance = 1e-6;

/// An instrument of a user's own: a cosine bump, derived from scalar_instrument.
class cosine_noise : public sy::scalar_instrument<cosine_noise> {
 public:
  cosine_noise() = default;
  [[nodiscard]] std::string_view name() const { return "cosine_noise"; }
  [[nodiscard]] double log_density(double x, double truth) const {
    double const z = x - truth;
    return std::abs(z) < half_pi ? std::log(0.5 * std::cos(z)) : std::numeric_limits<double>::lowest();
  }
  [[nodiscard]] double log_below(double x, double truth) const { return tail(x - truth); }
  [[nodiscard]] double log_above(double x, double truth) const { return tail(truth - x); }
  [[nodiscard]] double log_within(sy::cell const& c, double truth) const {
    double const a = std::max(c.lower - truth, -half_pi), b = std::min(c.upper - truth, half_pi);
    return a < b ? std::log(0.5 * (std::sin(b) - std::sin(a))) : std::numeric_limits<double>::lowest();
  }
  [[nodiscard]] double fake(double truth, sy::draws& d) const { return truth + std::asin(2.0 * d.uniform() - 1.0); }

 private:
  static constexpr double half_pi = 1.57079632679489661923;
  static double tail(double z) {
    if (z <= -half_pi) return std::numeric_limits<double>::lowest();
    return z >= half_pi ? 0.0 : std::log(0.5 * (1.0 + std::sin(z)));
  }
};

}  // namespace

TEST_CASE("continuous instruments: fakes follow the scores and the density holds all mass") {
  auto const holds = [](auto const& instrument, auto const& truth, std::uint64_t seed,
                        std::vector<double> const& marks) {
    CAPTURE(instrument.name());
    CAPTURE(seed);
    CHECK(chance_together(instrument, instrument, truth, seed) > least_chance);
    CHECK(worst_mass(instrument, truth, marks) < 2e-11);
  };
  holds(sy::normal_noise(0.3), 2.0, 1, {0.0, 1.0, 1.9, 2.0, 2.5, 4.0});
  holds(sy::relative_noise(0.2), -3.0, 2, {-6.0, -4.0, -3.1, -3.0, -2.0, 0.5});
  holds(sy::two_part_noise({.absolute = 0.3, .relative = 0.1}), 5.0, 3, {0.0, 4.0, 5.0, 5.2, 9.0});
  holds(sy::student_noise(0.5, 300.0), 1.0, 4, {-9.0, -1.0, 0.9, 1.0, 2.0, 3.0, 10.0});
  for (double const dof : {0.5, 1.0, 4.0})
    holds(sy::student_noise(0.5, dof), 1.0, 4, {-1000.0, -100.0, -10.0, -1.0, 0.9, 1.0, 2.0, 3.0, 30.0, 300.0});
  holds(sy::laplace_noise(0.4), -1.0, 5, {-12.0, -3.0, -1.0, -0.9, 0.0, 7.0});
  holds(sy::lognormal_noise(0.25), 3.0, 6, {0.2, 1.0, 2.0, 3.0, 3.1, 5.0, 20.0});
  holds(sy::uniform_tolerance(0.5), 2.0, 7, {1.5, 1.7, 2.0, 2.5});
  holds(sy::triangular_noise(0.5), 2.0, 8, {1.5, 1.7, 2.0, 2.2, 2.5});
  holds(sy::anywhere(-1.0, 4.0), 100.0, 9, {-1.0, 0.0, 2.0, 4.0});
  holds(sy::exponential_life(), 0.7, 10, {0.0, 0.1, 1.0, 5.0, 50.0});
  holds(cosine_noise(), 0.4, 11, {-1.1, 0.0, 0.4, 1.0, 1.9});
}

TEST_CASE("modifiers on continuous instruments: fakes follow the scores and the density holds all mass") {
  auto const holds = [](auto const& instrument, auto const& truth, std::uint64_t seed,
                        std::vector<double> const& marks) {
    CAPTURE(instrument.name());
    CAPTURE(seed);
    CHECK(chance_together(instrument, instrument, truth, seed) > least_chance);
    CHECK(worst_mass(instrument, truth, marks) < 2e-11);
  };
  holds(sy::with_outliers(sy::normal_noise(0.1), 0.2, sy::anywhere(0.0, 10.0)), 4.0, 20,
        {0.0, 3.0, 3.9, 4.0, 4.5, 10.0});
  holds(sy::with_outliers(sy::lognormal_noise(0.1), 0.3, sy::lognormal_noise(1.0)), 2.0, 21,
        {0.01, 0.1, 1.0, 2.0, 3.0, 9.0, 90.0});
  holds(sy::with_outliers(cosine_noise(), 0.5, sy::laplace_noise(2.0)), 0.0, 22,
        {-60.0, -10.0, -1.57079632679489661923, 0.0, 1.57079632679489661923, 10.0, 60.0});
  holds(sy::with_offset(sy::normal_noise(0.3), 0.4), 1.0, 23, {-3.0, 0.0, 1.0, 1.5, 5.0});
  holds(sy::with_offset(sy::with_offset(sy::relative_noise(0.1), 0.4), 0.2), 1.0, 24, {-3.0, 0.0, 1.0, 1.5, 5.0});
  sy::displaced const state{1.0, -0.7};
  holds(sy::with_offset(sy::student_noise(0.3, 5.0), 0.4), state, 25, {-90.0, -9.0, -1.0, 0.3, 1.0, 9.0, 90.0});
  holds(sy::with_offset(sy::with_outliers(sy::triangular_noise(0.5), 0.1, sy::laplace_noise(1.0)), 0.4), state, 26,
        {-40.0, -5.0, -0.2, 0.0, 0.3, 0.8, 5.0, 40.0});
}

TEST_CASE("counts: fakes follow the scores and all probabilities add up to 1") {
  auto const holds = [](auto const& instrument, double truth, std::uint64_t seed, long last) {
    CAPTURE(instrument.name());
    CAPTURE(truth);
    CHECK(chance_together(instrument, instrument, truth, seed) > least_chance);
    CHECK(worst_sum(instrument, truth, 1.0, 0, last) < 2e-13);
  };
  for (double const mean : {0.0, 0.02, 3.7, 40.0, 2000.0}) holds(sy::poisson_count(), mean, 30, 3000);
  holds(sy::poisson_count({.background = 2.5, .exposure = 4.0}), 0.9, 31, 80);
  for (double const p : {0.0, 1e-3, 0.3, 0.97, 1.0}) holds(sy::binomial_count(60), p, 32, 60);
  holds(sy::binomial_count(1), 0.4, 33, 1);
  for (double const size : {0.3, 2.0, 50.0, 1e6}) holds(sy::negative_binomial_count(size), 6.0, 34, 500);
  holds(sy::negative_binomial_count(2.0), 0.0, 34, 10);
  for (double const rate : {0.0, 0.5, 12.0, 400.0})
    holds(sy::dead_time_counter({.dead_time = 0.04, .counting_time = 1.5, .background = 0.3}), rate, 35, 38);
  holds(sy::dead_time_counter({.dead_time = 1e-6, .counting_time = 10.0}), 50.0, 36, 800);
  holds(sy::dead_time_counter({.dead_time = 0.0, .counting_time = 10.0}), 2.0, 37, 100);
  holds(sy::dead_time_counter({.dead_time = 2.0, .counting_time = 1.5}), 2.0, 38, 1);
  holds(sy::with_outliers(sy::poisson_count(), 0.1, sy::negative_binomial_count(1.0)), 5.0, 39, 300);
  holds(sy::with_outliers(sy::poisson_count(), 0.0, sy::negative_binomial_count(1.0)), 5.0, 39, 300);
}

TEST_CASE("displays: fakes follow the scores and all steps add up to 1") {
  auto const holds = [](auto const& instrument, auto const& truth, std::uint64_t seed, double step, long first,
                        long last) {
    CAPTURE(seed);
    CHECK(chance_together(instrument, instrument, truth, seed) > least_chance);
    CHECK(worst_sum(instrument, truth, step, first, last) < 2e-13);
  };
  holds(sy::rounded(0.1, sy::normal_noise(0.02)), 2.26, 50, 0.1, 10, 40);
  holds(sy::rounded(0.1, sy::normal_noise(0.7)), 2.26, 51, 0.1, -50, 90);
  holds(sy::rounded_down(0.5, sy::laplace_noise(0.4)), -0.3, 52, 0.5, -60, 60);
  holds(sy::rounded(0.01, sy::uniform_tolerance(0.035)), 1.0, 53, 0.01, 90, 110);
  holds(sy::rounded(0.25, sy::lognormal_noise(0.9)), 0.4, 54, 0.25, 0, 400);
  holds(sy::rounded(0.2, sy::student_noise(0.3, 2.0)), 0.4, 55, 0.2, -4000, 4000);
  holds(sy::rounded(5.0, sy::with_outliers(sy::normal_noise(3.0), 0.1, sy::anywhere(0.0, 200.0))), 71.0, 56, 5.0, 0,
        40);
  holds(sy::rounded(0.1, sy::with_offset(sy::normal_noise(0.1), 0.2)), 1.0, 57, 0.1, -20, 40);
  holds(sy::rounded(0.1, sy::with_offset(sy::triangular_noise(0.3), 0.2)), sy::displaced{1.0, 0.33}, 58, 0.1, 0, 30);
  holds(sy::rounded(10.0, sy::poisson_count()), 43.0, 59, 10.0, 0, 15);
  holds(sy::rounded(2.5, sy::poisson_count()), 7.0, 60, 2.5, 0, 20);
  holds(sy::rounded_down(10.0, sy::binomial_count(95)), 0.4, 61, 10.0, 0, 9);
  holds(sy::rounded(0.1, cosine_noise()), 0.04, 62, 0.1, -20, 20);
  holds(sy::with_outliers(sy::rounded(0.1, sy::normal_noise(0.1)), 0.3, sy::rounded(0.1, sy::normal_noise(0.5))), 0.04,
        63, 0.1, -60, 60);
}

TEST_CASE("a score that does not belong to the draws is caught") {
  CHECK(chance_together(sy::normal_noise(0.32), sy::normal_noise(0.3), 0.0, 70) < least_chance);
  CHECK(chance_together(sy::student_noise(1.0, 4.0), sy::normal_noise(1.0), 0.0, 71) < least_chance);
  CHECK(chance_together(sy::rounded(0.1, sy::normal_noise(0.1)), sy::rounded_down(0.1, sy::normal_noise(0.1)), 0.0,
                        72) < least_chance);
  CHECK(chance_together(sy::poisson_count(), sy::negative_binomial_count(100.0), 10.0, 73) < least_chance);
  CHECK(chance_together(sy::poisson_count({.exposure = 1.5}),
                        sy::dead_time_counter({.dead_time = 0.01, .counting_time = 1.5}), 12.0, 74) < least_chance);
  CHECK(chance_together(sy::with_outliers(sy::normal_noise(1.0), 0.01, sy::normal_noise(9.0)), sy::normal_noise(1.0),
                        0.0, 75, 200'000) < least_chance);
}

TEST_CASE("correlated readings: the distance of fakes is chi-square and the density holds all mass") {
  double const covariance[3][3] = {{4.0, 1.2, -0.6}, {1.2, 1.0, 0.2}, {-0.6, 0.2, 0.5}};
  auto const instrument = sy::correlated_noise(covariance);
  std::array<double, 3> const truth{1.0, -2.0, 30.0};
  sy::draws d(80, 0, sy::purpose::check);
  double const top = instrument.score(truth, truth).value;
  boost::math::chi_squared const law(3.0);
  std::size_t const n = 20'000;
  std::vector<double> cells(50), expected(50, static_cast<double>(n) / 50.0);
  std::array<std::array<double, 3>, 3> second{};
  double mass = 0.0, mass_square = 0.0;
  for (std::size_t i = 0; i < n; ++i) {
    auto const fake = instrument.draw(truth, d);
    double const score = instrument.score(fake, truth).value;
    ++cells[std::min<std::size_t>(static_cast<std::size_t>(50.0 * boost::math::cdf(law, 2.0 * (top - score))), 49)];
    double other = 0.0;  // a narrower density that certainly has mass 1
    for (std::size_t j = 0; j < 3; ++j) {
      other += sy::normal_noise(0.4).score(fake[j], truth[j]).value;
      for (std::size_t k = 0; k < 3; ++k) second[j][k] += (fake[j] - truth[j]) * (fake[k] - truth[k]);
    }
    double const ratio = std::exp(other - score);
    mass += ratio;
    mass_square += ratio * ratio;
  }
  double const m = static_cast<double>(n);
  CHECK(instrument_check::chance_of_counts(cells, expected) > least_chance);
  double const mean = mass / m, error = std::sqrt((mass_square / m - mean * mean) / m);
  CHECK(error < 0.05);
  CHECK(std::abs(mean - 1.0) < 5.0 * error);
  for (std::size_t j = 0; j < 3; ++j)
    for (std::size_t k = 0; k < 3; ++k) {
      double const c = covariance[j][k];
      CHECK(std::abs(second[j][k] / m - c) < 5.0 * std::sqrt((covariance[j][j] * covariance[k][k] + c * c) / m));
      CHECK(instrument.covariance()[j][k] == doctest::Approx(c).epsilon(1e-14));
    }
}

TEST_CASE("readings that share an unknown offset are correlated readings") {
  auto const shared = sy::with_offset(sy::two_part_noise({.absolute = 0.3, .relative = 0.1}), 0.5);
  std::array<double, 3> const truth{1.0, 4.0, -2.0}, reading{1.9, 4.4, -0.9};
  std::array<std::array<double, 3>, 3> covariance{};
  for (std::size_t i = 0; i < 3; ++i)
    for (std::size_t j = 0; j < 3; ++j) covariance[i][j] = 0.25 + (i == j ? 0.09 + 0.01 * truth[i] * truth[i] : 0.0);
  auto const same = sy::correlated_noise(covariance);
  CHECK(shared.score(reading, truth).value == doctest::Approx(same.score(reading, truth).value).epsilon(1e-13));
  for (auto& row : covariance)
    for (double& each : row) each += 0.04;
  CHECK(sy::with_offset(same, 0.2).score(reading, truth).value ==
        doctest::Approx(sy::correlated_noise(covariance).score(reading, truth).value).epsilon(1e-13));
  // an offset integrated out equals an offset drawn and averaged: quadrature over it
  auto const with_drawn = [&](double offset) {
    double sum = sy::normal_noise(0.5).score(offset, 0.0).value;
    for (std::size_t i = 0; i < 3; ++i)
      sum += sy::two_part_noise({.absolute = 0.3, .relative = 0.1}).score(reading[i] - offset, truth[i]).value;
    return sum;
  };
  CHECK(shared.score(reading, truth).value ==
        doctest::Approx(instrument_check::log_integral(with_drawn, -5.0, 6.0)).epsilon(1e-12));
  std::array<double, 1> const one{1.9}, one_truth{1.0};
  CHECK(shared.score(one, one_truth).value == doctest::Approx(shared.score(1.9, 1.0).value).epsilon(1e-13));

  sy::draws d(81, 0, sy::purpose::check);
  double top = shared.score(truth, truth).value;
  boost::math::chi_squared const law(3.0);
  std::vector<double> cells(50), expected(50, 400.0);
  for (int i = 0; i < 20'000; ++i) {
    double const distance = 2.0 * (top - shared.score(shared.draw(truth, d), truth).value);
    ++cells[std::min<std::size_t>(static_cast<std::size_t>(50.0 * boost::math::cdf(law, distance)), 49)];
  }
  CHECK(instrument_check::chance_of_counts(cells, expected) > least_chance);
}

TEST_CASE("a drawn offset is normal with its standard deviation") {
  auto const gauge = sy::with_offset(sy::student_noise(0.1, 3.0), 0.7);
  sy::draws d(82, 0, sy::purpose::check);
  std::vector<double> cells(50), expected(50, 400.0);
  for (int i = 0; i < 20'000; ++i) {
    double const u = std::exp(sy::normal_noise(0.7).score(sy::under(gauge.draw_offset(d)), 0.0).value);
    ++cells[std::min<std::size_t>(static_cast<std::size_t>(50.0 * u), 49)];
  }
  CHECK(instrument_check::chance_of_counts(cells, expected) > least_chance);
}

TEST_CASE("labels: fakes follow the scores, alone and several from one unknown row") {
  auto const grader = sy::label_grader(sy::confusion_counts({{12, 3, 1}, {0, 7, 2}, {2, 2, 30}}));
  for (std::size_t k = 0; k < 3; ++k) {
    sy::draws d(90, k, sy::purpose::check);
    std::vector<double> seen(3), expected(3);
    double sum = 0.0;
    for (std::size_t j = 0; j < 3; ++j) {
      expected[j] = 20'000.0 * std::exp(grader.score(j, k).value);
      sum += expected[j];
    }
    CHECK(sum == doctest::Approx(20'000.0).epsilon(1e-14));
    for (int i = 0; i < 20'000; ++i) ++seen[grader.draw(k, d)];
    CHECK(instrument_check::chance_of_counts(seen, expected) > least_chance);
  }
  auto const few = sy::label_grader(sy::confusion_counts({{1, 1}, {0, 2}}));
  std::array<int, 3> const truths{0, 0, 1};
  std::vector<double> seen(8), expected(8);
  double sum = 0.0;
  for (std::size_t cell = 0; cell < 8; ++cell) {
    std::array<std::size_t, 3> const labels{cell & 1, (cell >> 1) & 1, (cell >> 2) & 1};
    expected[cell] = 20'000.0 * std::exp(few.score(labels, truths).value);
    sum += expected[cell];
    std::array<std::size_t, 3> const swapped{labels[1], labels[0], labels[2]};
    CHECK(few.score(swapped, truths).value == doctest::Approx(few.score(labels, truths).value).epsilon(1e-14));
  }
  CHECK(sum == doctest::Approx(20'000.0).epsilon(1e-13));
  sy::draws d(91, 0, sy::purpose::check);
  for (int i = 0; i < 20'000; ++i) {
    auto const labels = few.draw(truths, d);
    ++seen[labels[0] + 2 * labels[1] + 4 * labels[2]];
  }
  CHECK(instrument_check::chance_of_counts(seen, expected) > least_chance);
}

TEST_CASE("scores of classes: fakes are calibrated, and the likelihood turns prevalence into them") {
  std::array<double, 3> const prevalence{0.2, 0.5, 0.3};
  auto const sees = [&](auto const& grader, std::uint64_t seed) {
    // classes at the training prevalence: Bayes' rule on the scores must give shares of classes that come true
    sy::draws d(seed, 0, sy::purpose::check);
    std::vector<double> hits(20), promised(20), variance(20);
    double mass = 0.0;
    int const n = 40'000;
    for (int i = 0; i < n; ++i) {
      double const u = d.uniform();
      std::size_t const truth = u < 0.2 ? 0 : u < 0.7 ? 1 : 2;
      auto const scores = grader.draw(truth, d);
      std::array<double, 3> posterior{};
      double total = 0.0;
      for (std::size_t k = 0; k < 3; ++k)
        total += posterior[k] = prevalence[k] * std::exp(grader.score(scores, k).value);
      mass += total;
      double const p = posterior[1] / total;
      auto const cell = std::min<std::size_t>(static_cast<std::size_t>(20.0 * p), 19);
      hits[cell] += truth == 1 ? 1.0 : 0.0;
      promised[cell] += p;
      variance[cell] += p * (1.0 - p);
    }
    double sum = 0.0;
    std::size_t cells = 1;
    for (std::size_t c = 0; c < 20; ++c)
      if (variance[c] > 10.0) {
        sum += (hits[c] - promised[c]) * (hits[c] - promised[c]) / variance[c];
        ++cells;
      }
    CHECK(cells > 8);
    CHECK(instrument_check::chance_of(sum, cells) > least_chance);
    return mass / n;
  };
  sy::grader_setting<3> const setting{.prevalence = prevalence, .concentration = 2.0};
  double const at_its_word = sees(sy::class_grader<3>(setting), 92);
  CHECK(at_its_word == doctest::Approx(1.0).epsilon(1e-12));  // scores are shares: the sum over classes is exact
  sees(sy::class_grader(sy::confusion_matrix({{0.8, 0.1, 0.1}, {0.1, 0.7, 0.2}, {0.0, 0.3, 0.7}}), setting), 93);
}

TEST_CASE("hits and misses: fakes follow the scores") {
  for (auto const scale : {sy::size_scale::linear, sy::size_scale::logarithmic}) {
    auto const inspection = sy::hit_miss({.half = 2.0, .slope = 1.5, .scale = scale, .false_calls = 0.05});
    for (double const size : {0.0, 0.5, 2.0, 5.0}) {
      sy::draws d(94, static_cast<std::uint64_t>(10.0 * size), sy::purpose::check);
      double const p = std::exp(inspection.score(true, size).value);
      CHECK(p + std::exp(inspection.score(false, size).value) == doctest::Approx(1.0).epsilon(1e-14));
      double hits = 0.0;
      for (int i = 0; i < 20'000; ++i) hits += inspection.draw(size, d) ? 1.0 : 0.0;
      CHECK(std::abs(hits - 20'000.0 * p) < 5.0 * std::sqrt(20'000.0 * p * (1.0 - p)));
    }
  }
}

TEST_CASE("every instrument is an instrument for its reading and truth") {
  static_assert(sy::instrument_for<sy::normal_instrument, double, double>);
  static_assert(sy::instrument_for<sy::normal_instrument, sy::under, double>);
  static_assert(sy::instrument_for<sy::poisson_instrument, int, double>);
  static_assert(sy::instrument_for<sy::poisson_instrument, sy::shown, double>);
  static_assert(sy::instrument_for<sy::correlated_instrument<2>, std::array<double, 2>, std::array<double, 2>>);
  static_assert(
      sy::instrument_for<sy::offset_instrument<sy::normal_instrument>, std::array<double, 4>, std::array<double, 4>>);
  static_assert(sy::instrument_for<sy::label_instrument<2>, bool, bool>);
  static_assert(sy::instrument_for<sy::grader_instrument<3>, std::array<float, 3>, int>);
  static_assert(sy::instrument_for<sy::hit_miss_instrument, bool, double>);
  static_assert(!sy::instrument_for<sy::hit_miss_instrument, int, double>);
  static_assert(!sy::instrument_for<sy::normal_instrument, bool, double>);
  static_assert(!sy::instrument_for<sy::normal_instrument, char const*, double>);
  static_assert(!sy::instrument_for<sy::correlated_instrument<2>, double, double>);
  static_assert(!sy::instrument_for<sy::grader_instrument<3>, std::array<double, 2>, int>);
  static_assert(!sy::instrument_for<double, double, double>);
}
