// SPDX-License-Identifier: BSL-1.0
// Published readings and posteriors, by quadrature over the prior with the
// instruments' scores: posteriors and log-evidences, all constants included.

#include <algorithm>
#include <array>
#include <cmath>
#include <vector>

#include <doctest/doctest.h>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/lognormal.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/instrument/instruments.hpp>

#include "instrument_check.hpp"

namespace sy = steelyard;
namespace bm = boost::math;
using doctest::Approx;
using instrument_check::log_integral;

namespace {

/// What quadrature makes of log-prior and log-likelihood on (a, b).
struct posterior {
  double log_evidence;
  double mean;
  double sd;
};

template <class F>
posterior integrate(F const& log_joint, double a, double b, std::size_t panels = 400) {
  double const whole = log_integral(log_joint, a, b, panels);
  double const base = a - 1.0;  // keeps the argument of the logarithm above 0
  double const first =
      std::exp(log_integral([&](double x) { return log_joint(x) + std::log(x - base); }, a, b, panels) - whole);
  double const mean = first + base;
  double const second = std::exp(
      log_integral([&](double x) { return log_joint(x) + 2.0 * std::log(std::abs(x - mean) + 1e-300); }, a, b, panels) -
      whole);
  return {whole, mean, std::sqrt(second)};
}

double log_gamma_prior(double x, double shape, double rate) {
  return shape * std::log(rate) - bm::lgamma(shape) + (shape - 1.0) * std::log(x) - rate * x;
}
double log_normal_prior(double x, double mean, double sd) { return sy::normal_noise(sd).score(x, mean).value; }

}  // namespace

TEST_CASE(
    "suspended particulate, JCGM 106:2012 and JCGM GUM-5:2026 example 10: one lognormal prior, one normal reading") {
  auto const log_prior = [](double y) { return sy::lognormal_noise(0.434).score(y, std::exp(-2.325)).value; };
  auto const instrument = sy::normal_noise(0.01575);
  auto const joint = [&](double y) { return log_prior(y) + instrument.score(0.225, y).value; };
  posterior const p = integrate(joint, 0.02, 0.6);
  CHECK(std::exp(p.log_evidence) == Approx(0.694812783717).epsilon(1e-11));
  CHECK(p.mean == Approx(0.219034627307).epsilon(1e-11));
  CHECK(p.sd == Approx(0.015745976466).epsilon(1e-9));
  CHECK(std::exp(log_integral(joint, 0.02, 0.2) - p.log_evidence) ==
        Approx(0.113340355517).epsilon(1e-10));  // published 0.11
  CHECK(std::exp(log_integral(log_prior, 1e-4, 0.2, 4000)) == Approx(0.950401652133).epsilon(1e-10));
}

TEST_CASE("ball bearings, JCGM 106:2012 9.5.4: gamma prior, normal reading, limit 2") {
  auto const log_prior = [](double y) { return log_gamma_prior(y, 4.0, 4.0); };
  auto const instrument = sy::normal_noise(0.25);
  auto const joint = [&](double y) { return log_prior(y) + instrument.score(1.9, y).value; };
  posterior const p = integrate(joint, 1e-9, 6.0);
  CHECK(std::exp(p.log_evidence) == Approx(0.169034295000).epsilon(1e-10));
  CHECK(p.mean == Approx(1.75875507654).epsilon(1e-11));
  CHECK(p.sd == Approx(0.242335422583).epsilon(1e-9));
  CHECK(std::exp(log_integral(joint, 1e-9, 2.0) - p.log_evidence) == Approx(0.840134757118).epsilon(1e-11));
  // consumer's and producer's risk: the instrument shows under or over the limit
  auto const accepted = [&](double y) { return log_prior(y) + instrument.score(sy::under(2.0), y).value; };
  auto const rejected = [&](double y) { return log_prior(y) + instrument.score(sy::over(2.0), y).value; };
  CHECK(std::exp(log_integral(log_prior, 2.0, 30.0)) == Approx(0.0423801119917).epsilon(1e-10));
  CHECK(std::exp(log_integral(accepted, 2.0, 30.0)) == Approx(0.00801911188429).epsilon(1e-10));
  CHECK(std::exp(log_integral(rejected, 1e-9, 2.0)) == Approx(0.0174445692298).epsilon(1e-10));
  CHECK(std::exp(log_integral(accepted, 1e-9, 2.0)) + std::exp(log_integral(accepted, 2.0, 30.0)) ==
        Approx(0.948194430663).epsilon(1e-10));
}

TEST_CASE("JCGM 106:2012 clause 7: conformity under a flat prior is a probability of the reading turned round") {
  // inputs from memory; the figures follow from them
  CHECK(std::exp(sy::normal_noise(0.05).score(sy::under(-5.40), -5.47).value) == Approx(0.919243340766).epsilon(1e-11));
  CHECK(std::exp(sy::normal_noise(1.8).score(sy::within(12.5, 16.3), 13.6).value) ==
        Approx(0.662629786495).epsilon(1e-11));
}

TEST_CASE("alpha particles, Rutherford & Geiger, Phil. Mag. 20, 1910: Poisson counts, prior Gamma(2, rate 0.5)") {
  double const intervals[] = {57, 203, 383, 525, 532, 408, 273, 139,
                              45, 27,  10,  4,   0,   1,   1};  // of 1/8 minute with 0, 1, ... counts
  auto const instrument = sy::poisson_count();
  auto const log_likelihood = [&](double rate) {
    double sum = 0.0;
    int count = 0;
    for (double const times : intervals) sum += times * instrument.score(count++, rate).value;
    return sum;
  };
  posterior const p = integrate([&](double r) { return log_gamma_prior(r, 2.0, 0.5) + log_likelihood(r); }, 3.4, 4.4);
  CHECK(p.log_evidence == Approx(-5356.410927390413).epsilon(1e-13));
  CHECK(p.mean == Approx(3.87157370136094).epsilon(1e-11));
  CHECK(p.sd == Approx(0.0385255054253799).epsilon(1e-9));
  double const above =
      log_integral([&](double r) { return log_gamma_prior(r, 2.0, 0.5) + log_likelihood(r); }, 4.0, 4.4);
  CHECK(std::exp(above - p.log_evidence) == Approx(0.000482245374895).epsilon(1e-8));
}

TEST_CASE("horse kicks, von Bortkiewicz 1898: Poisson counts, prior Gamma(2, rate 2)") {
  double const corps_years[] = {144, 91, 32, 11, 2};  // with 0, 1, ... deaths
  auto const joint = [&](double rate) {
    double sum = log_gamma_prior(rate, 2.0, 2.0);
    int deaths = 0;
    for (double const times : corps_years) sum += times * sy::poisson_count().score(deaths++, rate).value;
    return sum;
  };
  posterior const p = integrate(joint, 0.3, 1.4);
  CHECK(p.log_evidence == Approx(-316.6053793143109).epsilon(1e-13));
  CHECK(p.mean == Approx(0.702127659574468).epsilon(1e-11));
  CHECK(p.sd == Approx(0.0498980399981216).epsilon(1e-9));
  // the same in one reading: the sum of 280 counts is one count with an exposure of 280
  auto const summed = sy::poisson_count({.exposure = 280.0});
  posterior const one =
      integrate([&](double r) { return log_gamma_prior(r, 2.0, 2.0) + summed.score(196, r).value; }, 0.3, 1.4);
  CHECK(one.mean == Approx(0.702127659574468).epsilon(1e-11));
}

TEST_CASE("Laplace's births in Paris, 241 945 girls and 251 527 boys (counts from memory): a probability of 1e-42") {
  auto const instrument = sy::binomial_count(241'945 + 251'527);
  auto const score = [&](double share) { return instrument.score(241'945, share).value; };
  double const all = log_integral(score, 0.48, 0.501), half = log_integral(score, 0.5, 0.502, 2000);
  CHECK(half - all == Approx(std::log(1.1460584901553381e-42)).epsilon(1e-10));
  // uniform prior: every number of girls is equally likely before
  CHECK(all == Approx(-std::log(241'945.0 + 251'527.0 + 1.0)).epsilon(1e-12));
}

TEST_CASE("leukaemia remissions on 6-MP, Freireich 1963, Gehan 1965: lives, some only known to be longer") {
  using sy::over;  // still in remission when last seen
  std::vector<sy::shown> const weeks{10, 7, over(32), 23, 22, 6, 16, over(34), over(32), over(25), over(11), over(20),
                                     over(19), 6, over(17), over(35), 6, 13, over(9), over(6), over(10)};
  auto const instrument = sy::exponential_life();
  auto const joint = [&](double rate) {
    double sum = log_gamma_prior(rate, 1.0, 10.0);
    for (sy::shown const& each : weeks) sum += instrument.score(each, rate).value;
    return sum;
  };
  posterior const p = integrate(joint, 1e-9, 0.3);
  CHECK(p.log_evidence == Approx(-44.0035538673297566).epsilon(1e-12));
  CHECK(p.mean == Approx(0.02710027100271).epsilon(1e-10));
  CHECK(p.sd == Approx(0.00856985815763789).epsilon(1e-8));
  double const low = log_integral(joint, 1e-9, 0.0129956333229);
  CHECK(std::exp(low - p.log_evidence) == Approx(0.025).epsilon(1e-8));
}

TEST_CASE("speed of light, Michelson 1879 (km/s less 299000): normal readings, and rounded ones") {
  double const speeds[] = {850,  740, 900, 1070, 930, 850, 950, 980, 980, 880, 1000, 980, 930, 650, 760, 810, 1000,
                           1000, 960, 960, 960,  940, 960, 940, 880, 800, 850, 880,  900, 840, 830, 790, 810, 880,
                           880,  830, 800, 790,  760, 800, 880, 880, 880, 860, 720,  720, 620, 860, 970, 950, 880,
                           910,  850, 870, 840,  840, 850, 840, 840, 840, 890, 810,  810, 820, 800, 770, 760, 740,
                           750,  760, 910, 920,  890, 860, 880, 720, 840, 850, 850,  780, 890, 840, 780, 810, 760,
                           810,  790, 810, 820,  850, 870, 870, 810, 740, 810, 940,  950, 800, 810, 870};
  static_assert(sizeof speeds / sizeof speeds[0] == 100);
  auto const sum_of = [&](auto const& instrument, double truth, int n) {
    double sum = 0.0;
    for (int i = 0; i < n; ++i) sum += instrument.score(speeds[i], truth).value;
    return sum;
  };
  auto const exact = sy::normal_noise(79.0);
  posterior const all =
      integrate([&](double c) { return log_normal_prior(c, 800.0, 100.0) + sum_of(exact, c, 100); }, 780.0, 930.0);
  CHECK(all.log_evidence == Approx(-581.029712331705879).epsilon(1e-13));
  CHECK(all.mean == Approx(852.074999925465).epsilon(1e-12));
  CHECK(all.sd == Approx(7.8754628427517).epsilon(1e-9));
  // experiment 1: the 20 readings stand in tens
  auto const tens = sy::rounded(10.0, sy::normal_noise(79.0));
  posterior const rounded =
      integrate([&](double c) { return log_normal_prior(c, 850.0, 100.0) + sum_of(tens, c, 20); }, 740.0, 1080.0);
  CHECK(rounded.log_evidence == Approx(-78.382639745722).epsilon(1e-13));
  CHECK(rounded.mean == Approx(907.212254920828).epsilon(1e-12));
  CHECK(rounded.sd == Approx(17.406858792707).epsilon(1e-9));
  posterior const ignored =
      integrate([&](double c) { return log_normal_prior(c, 850.0, 100.0) + sum_of(exact, c, 20); }, 740.0, 1080.0);
  // the closed form without rounding, mean (850/100^2 + 20 mean/79^2) / (1/100^2 + 20/79^2): rounding is seen
  double const precision = 1.0 / 1e4 + 20.0 / 6241.0;
  CHECK(ignored.mean == Approx((850.0 / 1e4 + 18180.0 / 6241.0) / precision).epsilon(1e-12));
  CHECK(ignored.sd == Approx(1.0 / std::sqrt(precision)).epsilon(1e-9));
  CHECK(std::abs(ignored.sd - rounded.sd) > 1e-3);
}

TEST_CASE("liver scans, Altman & Bland, BMJ 308, 1994, 1552 and 309, 102: predictive values") {
  // 258 abnormal livers: 231 scans abnormal, 27 normal; 86 normal livers: 32 and 54
  auto const predictive = [](auto const& scan, int label, double prevalence) {
    double const ill = prevalence * std::exp(scan.score(label, 1).value);
    double const well = (1.0 - prevalence) * std::exp(scan.score(label, 0).value);
    return label == 1 ? ill / (ill + well) : well / (ill + well);
  };
  auto const scan = sy::label_grader(sy::confusion_matrix({{54.0 / 86.0, 32.0 / 86.0}, {27.0 / 258.0, 231.0 / 258.0}}));
  CHECK(predictive(scan, 1, 0.75) == Approx(0.878326996198).epsilon(1e-11));
  CHECK(predictive(scan, 1, 0.25) == Approx(0.445086705202).epsilon(1e-11));
  CHECK(predictive(scan, 0, 0.25) == Approx(0.947368421053).epsilon(1e-11));
  // from the counts: without a prior the same, with Jeffreys' a little less sure
  CHECK(predictive(sy::label_grader(sy::confusion_counts({{54, 32}, {27, 231}}, 0.0)), 1, 0.75) ==
        Approx(0.878326996198).epsilon(1e-11));
  double const careful = predictive(sy::label_grader(sy::confusion_counts({{54, 32}, {27, 231}})), 1, 0.75);
  CHECK(careful < 0.878326996198);
  CHECK(careful > 0.87);
}

TEST_CASE("two neurologists, Westlund & Kurland 1953, Landis & Koch, Biometrics 33, 1977: a confusion matrix of four") {
  // rows: Winnipeg's diagnosis (certain, probable, possible, doubtful), columns: New Orleans', 149 Winnipeg patients
  std::array<std::array<double, 4>, 4> const counts{{{38, 33, 10, 3}, {5, 11, 14, 7}, {0, 3, 5, 3}, {1, 0, 6, 10}}};
  double total = 0.0;
  for (auto const& row : counts)
    for (double const each : row) total += each;
  CHECK(total == 149.0);
  auto const raw = sy::label_grader(sy::confusion_counts(counts, 0.0));
  CHECK(std::exp(raw.score(0, 0).value) == Approx(38.0 / 84.0).epsilon(1e-14));
  CHECK(std::exp(raw.score(3, 3).value) == Approx(10.0 / 17.0).epsilon(1e-14));
  CHECK(raw.score(0, 2).value == std::numeric_limits<double>::lowest());  // never seen, so without a prior impossible
  auto const second = sy::label_grader(sy::confusion_counts(counts));
  CHECK(std::exp(second.score(0, 2).value) == Approx(0.5 / 13.0).epsilon(1e-14));
  // the 69 patients of New Orleans, four by four, as one reading: the Dirichlet-multinomial law by Boost's gamma
  // function
  std::array<std::array<int, 4>, 4> const others{{{5, 3, 2, 1}, {3, 11, 13, 2}, {0, 4, 3, 4}, {0, 0, 4, 14}}};
  std::array<int, 69> labels{}, truths{};
  double exact = 0.0;
  std::size_t at = 0;
  for (std::size_t k = 0; k < 4; ++k) {
    double before = 0.0, after = 0.0;
    for (std::size_t j = 0; j < 4; ++j) {
      double const weight = counts[k][j] + 0.5, more = others[k][j];
      exact += bm::lgamma(weight + more) - bm::lgamma(weight);
      before += weight;
      after += weight + more;
      for (int i = 0; i < others[k][j]; ++i, ++at) {
        labels[at] = static_cast<int>(j);
        truths[at] = static_cast<int>(k);
      }
    }
    exact += bm::lgamma(before) - bm::lgamma(after);
  }
  REQUIRE(at == 69);
  double independent = 0.0;
  for (std::size_t i = 0; i < 69; ++i) independent += second.score(labels[i], truths[i]).value;
  CHECK(second.score(labels, truths).value == Approx(exact).epsilon(1e-12));
  CHECK(std::abs(independent - exact) > 0.1);  // taking them as independent is another law
  // a grader's scores at a word worth what the matrix says: between the labels, and nothing from an even score
  auto const scores = sy::class_grader(sy::confusion_counts(counts));
  std::array<double, 4> const certain{1.0, 0.0, 0.0, 0.0}, even{0.25, 0.25, 0.25, 0.25};
  for (int k = 0; k < 4; ++k) {
    CHECK(scores.score(certain, k).value == Approx(std::log(4.0) + second.score(0, k).value).epsilon(1e-13));
    CHECK(std::abs(scores.score(even, k).value) < 1e-15);
  }
}
