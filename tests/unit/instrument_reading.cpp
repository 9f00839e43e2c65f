// SPDX-License-Identifier: BSL-1.0
// Readings: where they are taken, what they refuse and what they doubt; the far
// tails that must stay finite; the small parts instruments are made of.

#include <array>
#include <cmath>
#include <limits>
#include <span>
#include <string>
#include <vector>

#include <doctest/doctest.h>

#include <steelyard/instrument/checks.hpp>
#include <steelyard/instrument/count_laws.hpp>
#include <steelyard/instrument/count_tails.hpp>
#include <steelyard/instrument/counting.hpp>
#include <steelyard/instrument/instruments.hpp>
#include <steelyard/instrument/log_sum.hpp>
#include <steelyard/instrument/normal_tails.hpp>
#include <steelyard/instrument/quiet.hpp>
#include <steelyard/weigh/readout.hpp>
#include <steelyard/weigh/together.hpp>

namespace sy = steelyard;

namespace {

struct tank {
  double level;
  float inflow;
  int valves;
};
enum class grade { sound, shrinkage, gas };

double const impossible = std::numeric_limits<double>::lowest();
double const not_a_number = std::numeric_limits<double>::quiet_NaN();
double const infinite = std::numeric_limits<double>::infinity();

/// The sentence that a call is refused with; empty where it is not.
template <class Error, class F>
std::string sentence(F const& f) {
  try {
    f();
  } catch (Error const& problem) {
    return problem.what();
  }
  return {};
}
template <class F>
std::string argument(F const& f) {
  return sentence<sy::bad_argument>(f);
}
bool says(std::string const& text, std::string const& words) { return text.find(words) != std::string::npos; }

}  // namespace

TEST_CASE("a reading is a weighter: value, readout and instrument put together") {
  auto const level = sy::readout{"level", "m", &tank::level};
  auto const gauge = sy::reading("gauge", 2.31, level, sy::normal_noise(0.05));
  tank const state{2.3, 4.0f, 3};
  CHECK(gauge.name() == "gauge");
  CHECK(gauge.value() == 2.31);
  CHECK(gauge.readout().name() == "level");
  CHECK(gauge.instrument().sd(0.0) == 0.05);
  CHECK(gauge(state).value == sy::normal_noise(0.05).score(2.31, 2.3).value);
  static_assert(sy::weighter_for<decltype(gauge), tank>);
  static_assert(!sy::weighter_for<decltype(gauge), double>);

  auto const nameless = sy::reading(2.31, &tank::level, sy::normal_noise(0.05));
  CHECK(nameless.name() == "reading");
  CHECK(sy::reading(2.31, level, sy::normal_noise(0.05)).name() == "level");
  CHECK(nameless(state).value == gauge(state).value);
  // other number types of value and truth
  CHECK(sy::reading("n", 3u, &tank::inflow, sy::poisson_count())(state).value ==
        sy::poisson_count().score(3, 4.0).value);
  CHECK(sy::reading("n", 3L, &tank::valves, sy::poisson_count())(state).value ==
        sy::poisson_count().score(3, 3.0).value);
  CHECK(sy::reading("low", sy::under(2.0), &tank::level, sy::normal_noise(0.5))(state).value ==
        sy::normal_noise(0.5).score(sy::under(2.0), 2.3).value);
  CHECK(sy::reading("hit", true, &tank::level, sy::hit_miss({.half = 1.0}))(state).value ==
        sy::hit_miss({.half = 1.0}).score(true, 2.3).value);
  auto const labels = sy::label_grader(sy::confusion_matrix({{0.8, 0.1, 0.1}, {0.1, 0.8, 0.1}, {0.0, 0.3, 0.7}}));
  auto const graded = sy::reading(
      "grade", grade::shrinkage, [](tank const&) { return grade::gas; }, labels);
  CHECK(graded(state).value == doctest::Approx(std::log(0.3)).epsilon(1e-14));

  auto const both = sy::together(gauge, sy::reading("dipstick", 2.3, level, sy::rounded(0.1, sy::normal_noise(0.02))));
  std::array<double, 2> scores{};
  both.scores(state, scores);
  CHECK(both.name(1) == "dipstick");
  CHECK(scores[0] == gauge(state).value);
  CHECK(scores[1] == doctest::Approx(std::log(std::erf(0.05 / 0.02 / std::sqrt(2.0)))).epsilon(1e-12));
  CHECK_THROWS_AS(sy::together(gauge, gauge), sy::bad_name);
}

TEST_CASE("a reading whose readout has scratch space gets one for each worker") {
  auto const scratch = sy::per_worker([] {
    return [calls = 0](tank const& t) mutable {
      ++calls;
      return t.level;
    };
  });
  auto const gauge = sy::reading("gauge", 2.31, scratch, sy::normal_noise(0.05));
  auto const own = gauge.worker_instance();
  CHECK(own(tank{2.3, 0.0f, 0}).value == sy::normal_noise(0.05).score(2.31, 2.3).value);
  CHECK(own.name() == "gauge");
}

TEST_CASE("impossible settings are refused by name") {
  CHECK(says(argument([] { sy::normal_noise(0.0); }), "normal_noise: a standard deviation of 0"));
  CHECK(says(argument([] { sy::normal_noise(-1.0); }), "-1"));
  CHECK(says(argument([] { sy::normal_noise(not_a_number); }), "NaN"));
  CHECK(says(argument([] { sy::normal_noise(infinite); }), "inf"));
  CHECK(says(argument([] { sy::relative_noise(0.0); }), "relative_noise: a share of 0"));
  CHECK(says(argument([] { sy::two_part_noise({.absolute = -0.1, .relative = 0.1}); }),
             "two_part_noise: an absolute part"));
  CHECK(!argument([] { sy::two_part_noise({}); }).empty());
  CHECK(says(argument([] { sy::student_noise(0.0, 3.0); }), "student_noise: a scale of 0"));
  CHECK(says(argument([] { sy::student_noise(1.0, 0.0); }), "student_noise: 0 degrees of freedom"));
  CHECK(says(argument([] { sy::laplace_noise(-2.0); }), "laplace_noise: a scale of -2"));
  CHECK(says(argument([] { sy::lognormal_noise(0.0); }), "lognormal_noise"));
  CHECK(says(argument([] { sy::uniform_tolerance(0.0); }), "uniform_tolerance: a half width of 0"));
  CHECK(says(argument([] { sy::triangular_noise(0.0); }), "triangular_noise: a half width of 0"));
  CHECK(says(argument([] { sy::anywhere(2.0, 2.0); }), "anywhere: a width (upper - lower) of 0"));
  CHECK(says(argument([] { sy::poisson_count({.background = -1.0}); }), "poisson_count: a background of -1"));
  CHECK(says(argument([] { sy::poisson_count({.exposure = 0.0}); }), "poisson_count: an exposure of 0"));
  CHECK(says(argument([] { sy::binomial_count(0); }), "binomial_count: 0 trials"));
  CHECK(says(argument([] { sy::binomial_count(-3); }), "-3"));
  CHECK(says(argument([] { sy::negative_binomial_count(0.0); }), "negative_binomial_count: a size of 0"));
  CHECK(says(argument([] { sy::dead_time_counter({.dead_time = -1.0}); }), "dead_time_counter: a dead time of -1"));
  CHECK(
      says(argument([] { sy::dead_time_counter({.counting_time = 0.0}); }), "dead_time_counter: a counting time of 0"));
  CHECK(says(argument([] { sy::rounded(0.0, sy::normal_noise(1.0)); }), "rounded: a display step of 0"));
  CHECK(says(argument([] { sy::with_offset(sy::normal_noise(1.0), 0.0); }), "with_offset: a standard deviation of 0"));
  CHECK(
      says(argument([] { sy::with_offset(sy::laplace_noise(1.0), -1.0); }), "with_offset: a standard deviation of -1"));
  CHECK(says(argument([] { sy::with_outliers(sy::normal_noise(1.0), 1.5, sy::normal_noise(9.0)); }),
             "with_outliers: a share of 1.5"));
  CHECK(says(argument([] { sy::correlated_noise({{1.0, 2.0}, {2.0, 1.0}}); }), "not positive definite"));
  CHECK(says(argument([] { sy::correlated_noise({{1.0, 1.0}, {1.0, 1.0}}); }), "not positive definite"));
  CHECK(says(argument([] { sy::correlated_noise({{1.0, 0.5}, {0.4, 1.0}}); }), "not symmetric at 1, 0"));
  CHECK(says(argument([] { sy::correlated_noise({{0.0}}); }), "a variance of 0"));
  CHECK(says(argument([] { sy::correlated_noise({{1.0, not_a_number}, {0.4, 1.0}}); }), "not symmetric"));
  CHECK(says(argument([] {
               sy::confusion_matrix({{1.0, 0.0}, {0.2, 0.7}});
             }),
             "confusion_matrix: row 1 sums to 0.8999"));
  CHECK(says(argument([] { sy::confusion_matrix({{1.2, -0.2}, {0.2, 0.8}}); }), "confusion_matrix: an entry of 1.2"));
  CHECK(says(argument([] { sy::confusion_counts({{3, -1}, {0, 2}}); }), "confusion_counts: a count of -1"));
  CHECK(says(argument([] { sy::confusion_counts({{0, 0}, {0, 2}}, 0.0); }), "no item of class 0"));
  CHECK(says(argument([] {
               sy::class_grader<2>({.prevalence = {0.5, 0.6}});
             }),
             "class_grader: the prevalences sum to 1.1"));
  CHECK(says(argument([] { sy::class_grader<2>({.prevalence = {1.0, 0.0}}); }), "a prevalence of 0"));
  CHECK(says(argument([] { sy::hit_miss({.half = 0.0}); }), "hit_miss: a size found half of the time of 0"));
  CHECK(says(argument([] { sy::hit_miss({.slope = -1.0}); }), "hit_miss: a slope of -1"));
  CHECK(says(argument([] { sy::hit_miss({.false_calls = 2.0}); }), "hit_miss: a chance of false calls of 2"));
}

TEST_CASE("readings an instrument could never show are refused, when a reading is made and when it is scored") {
  auto const refused = [](auto const& value, auto const& instrument, std::string const& words) {
    CAPTURE(words);
    CHECK(says(argument([&] { sy::reading("gauge", value, &tank::level, instrument); }), "reading 'gauge': "));
    CHECK(says(argument([&] { sy::reading("gauge", value, &tank::level, instrument); }), words));
    if constexpr (requires { instrument.score(value, 1.0); })
      CHECK(says(argument([&] { instrument.score(value, 1.0); }), words));
  };
  auto const fine = [](auto const& value, auto const& instrument) {
    CHECK(argument([&] { sy::reading("gauge", value, &tank::level, instrument); }).empty());
  };
  refused(not_a_number, sy::normal_noise(1.0), "NaN");
  refused(infinite, sy::normal_noise(1.0), "inf");
  refused(0.0, sy::lognormal_noise(0.1),
          "lognormal_noise: a reading of 0 can never be shown; it shows numbers above 0");
  refused(sy::under(0.0), sy::lognormal_noise(0.1), "under 0");
  fine(sy::over(-1.0), sy::lognormal_noise(0.1));
  refused(-0.1, sy::exponential_life(), "exponential_life: a reading of -0.1");
  fine(0.0, sy::exponential_life());
  refused(11.0, sy::anywhere(0.0, 10.0), "anywhere: a reading of 11 can never be shown; it shows numbers from 0 to 10");
  refused(-1, sy::poisson_count(),
          "poisson_count: a reading of -1 can never be shown; it shows whole numbers from 0 up");
  refused(2.5, sy::poisson_count(), "a reading of 2.5");
  refused(sy::within(2.1, 2.9), sy::poisson_count(), "within 2.1 to 2.9");
  fine(sy::within(2.1, 3.9), sy::poisson_count());
  refused(sy::under(0), sy::poisson_count(), "under 0");
  refused(31, sy::binomial_count(30),
          "binomial_count: a reading of 31 can never be shown; it shows whole numbers from 0 to 30");
  refused(sy::over(30), sy::binomial_count(30), "over 30");
  refused(16, sy::dead_time_counter({.dead_time = 0.1, .counting_time = 1.45}), "a reading of 16");
  fine(15, sy::dead_time_counter({.dead_time = 0.1, .counting_time = 1.45}));
  refused(2.33, sy::rounded(0.1, sy::normal_noise(1.0)),
          "rounded: a reading of 2.33 can never be shown; it shows multiples of 0.1");
  refused(2.30001, sy::rounded(0.1, sy::normal_noise(1.0)), "2.30001");
  fine(2.3, sy::rounded(0.1, sy::normal_noise(1.0)));
  fine(-1234567.8, sy::rounded(0.1, sy::normal_noise(1.0)));
  fine(0.1 + 0.2, sy::rounded(0.1, sy::normal_noise(1.0)));
  fine(0.0, sy::rounded(0.1, sy::lognormal_noise(1.0)));
  refused(-0.1, sy::rounded(0.1, sy::lognormal_noise(1.0)), "rounded from numbers above 0");
  refused(35, sy::rounded(10.0, sy::binomial_count(32)), "a reading of 35");
  refused(40, sy::rounded(10.0, sy::binomial_count(32)), "a reading of 40");
  fine(30, sy::rounded(10.0, sy::binomial_count(32)));
  refused(sy::within(2.31, 2.39), sy::rounded(0.1, sy::normal_noise(1.0)), "within 2.31 to 2.39");
  refused(-1.0, sy::with_outliers(sy::lognormal_noise(1.0), 0.1, sy::anywhere(0.0, 10.0)),
          "as outliers numbers from 0 to 10");
  fine(12.0, sy::with_outliers(sy::lognormal_noise(1.0), 0.1, sy::anywhere(0.0, 10.0)));
  auto const few_or_many = sy::with_outliers(sy::binomial_count(10), 0.1, sy::poisson_count());
  fine(15, few_or_many);
  refused(1.5, few_or_many, "with_outliers: a reading of 1.5");
  refused(std::array{1.0, not_a_number}, sy::correlated_noise({{1.0, 0.0}, {0.0, 1.0}}),
          "correlated_noise: reading 1 is NaN");
  refused(std::array{1.0, not_a_number}, sy::with_offset(sy::normal_noise(1.0), 1.0), "NaN");
  refused(2, sy::label_grader(sy::confusion_matrix({{1.0, 0.0}, {0.0, 1.0}})), "label_grader: a label outside 0 to 1");
  refused(-1, sy::label_grader(sy::confusion_matrix({{1.0, 0.0}, {0.0, 1.0}})), "label_grader: a label outside 0 to 1");
  refused(std::array{0.5, 0.6}, sy::class_grader<2>(), "class_grader: the scores sum to 1.1");
  refused(std::array{1.5, -0.5}, sy::class_grader<2>(), "class_grader: a score of 1.5");
  CHECK(says(argument([] {
               sy::within(2.0, 2.0);
               sy::shown(sy::within(2.0, 2.0));
             }),
             "within: the lower end 2"));
  CHECK(says(argument([] { sy::shown(sy::over(not_a_number)); }), "over NaN"));
}

TEST_CASE("true values that make no sense are refused with the reading's name") {
  auto const refused = [](auto const& instrument, auto const& value, double truth, std::string const& words) {
    CAPTURE(words);
    auto const gauge = sy::reading("gauge", value, &tank::level, instrument);
    std::string const said = sentence<sy::bad_readout>([&] { gauge(tank{truth, 0.0f, 0}); });
    CHECK(says(said, "reading 'gauge': "));
    CHECK(says(said, words));
    sy::draws d(1);
    CHECK(!sentence<sy::bad_readout>([&] { instrument.draw(truth, d); }).empty());
  };
  refused(sy::normal_noise(1.0), 2.0, not_a_number, "normal_noise: a true value of NaN makes no sense here");
  refused(sy::normal_noise(1.0), 2.0, infinite, "inf");
  refused(sy::rounded(0.5, sy::laplace_noise(1.0)), 2.0, not_a_number, "laplace_noise: a true value of NaN");
  refused(sy::with_outliers(sy::normal_noise(1.0), 0.1, sy::anywhere(0.0, 9.0)), 2.0, not_a_number, "NaN");
  refused(sy::lognormal_noise(1.0), 2.0, -0.1, "a true value of -0.1");
  refused(sy::exponential_life(), 2.0, -0.1, "0 or more");
  refused(sy::poisson_count(), 2, -0.1, "0 or more");
  refused(sy::negative_binomial_count(1.0), 2, -0.1, "0 or more");
  refused(sy::dead_time_counter({}), 2, -0.1, "0 or more");
  refused(sy::binomial_count(5), 2, 1.1,
          "binomial_count: a true value of 1.1 makes no sense here; it must be a probability");
  refused(sy::hit_miss({}), true, -0.1, "0 or more");
  CHECK(!sentence<sy::bad_readout>([] {
           sy::correlated_noise({{1.0}}).score(std::array{1.0}, std::array{not_a_number});
         }).empty());
  auto const labels = sy::label_grader(sy::confusion_matrix({{1.0, 0.0}, {0.0, 1.0}}));
  CHECK(says(sentence<sy::bad_readout>([&] { labels.score(1, 2); }), "label_grader: a true class outside 0 to 1"));
  CHECK(says(sentence<sy::bad_readout>([&] {
               sy::class_grader<2>().score(std::array{0.5, 0.5}, -1);
             }),
             "class_grader"));
  CHECK(says(sentence<sy::bad_readout>([] { sy::relative_noise(0.1).score(0.0, 0.0); }), "unbounded"));
  // what rounding leaves beyond the end is the end
  CHECK(sy::poisson_count().score(0, -1e-15).value == 0.0);
  CHECK(sy::binomial_count(5).score(5, 1.0 + 1e-15).value == 0.0);
}

TEST_CASE("a reading 12 orders of magnitude off scale is weighed, with a doubt") {
  auto const far = sy::reading("gauge", 3e13, &tank::level, sy::normal_noise(0.1));
  CHECK(far.doubts() ==
        "reading 'gauge': a value of 3e+13 is 12 orders of magnitude or more above the instrument's error of "
        "0.1; check its unit");
  CHECK(far(tank{2.0, 0.0f, 0}).value < -1e27);
  CHECK(far(tank{2.0, 0.0f, 0}).value > impossible);
  CHECK(sy::reading("gauge", 3e10, &tank::level, sy::normal_noise(0.1)).doubts().empty());
  CHECK(!sy::reading("gauge", sy::over(-3e13), &tank::level, sy::normal_noise(0.1)).doubts().empty());
  CHECK(!sy::reading("gauge", std::array{1.0, 3e13}, &tank::level, sy::correlated_noise({{1.0, 0.0}, {0.0, 1.0}}))
             .doubts()
             .empty());
  auto const share = sy::reading(3e13, &tank::level, sy::relative_noise(0.1));
  CHECK(share.doubts().empty());
  CHECK(says(share.doubts(tank{2.0, 0.0f, 0}), "reading: a value of 3e+13 and a true value of 2 are 12 orders"));
  CHECK(share.doubts(tank{2e10, 0.0f, 0}).empty());
}

TEST_CASE("far tails score by their log-density, however far") {
  for (double const z : {60.0, 1e6, 1e12, 1e100})
    CHECK(sy::normal_noise(1.0).score(z, 0.0).value ==
          doctest::Approx(-0.5 * z * z - 0.5 * std::log(2.0 * 3.14159265358979)).epsilon(1e-14));
  double const beyond = sy::normal_noise(1e-200).score(1e200, 0.0).value;  // the square would not be finite
  CHECK(beyond < -1e299);
  CHECK(beyond > impossible);
  CHECK(sy::normal_noise(1.0).score(1e308, -1e308).value > impossible);
  CHECK(sy::student_noise(1.0, 3.0).score(1e200, 0.0).value ==
        doctest::Approx(-4.0 * 200.0 * std::log(10.0)).epsilon(1e-2));
  CHECK(sy::student_noise(1.0, 3.0).score(sy::over(1e140), 0.0).value ==
        doctest::Approx(-3.0 * 140.0 * std::log(10.0)).epsilon(1e-2));
  // a power law, also across the place where an asymptotic form takes over (sqrt(3) 1e8)
  CHECK(sy::student_noise(1.0, 3.0).score(sy::over(2e8), 0.0).value -
            sy::student_noise(1.0, 3.0).score(sy::over(1e8), 0.0).value ==
        doctest::Approx(-3.0 * std::log(2.0)).epsilon(1e-13));
  CHECK(sy::student_noise(1.0, 3.0).score(2e8, 0.0).value - sy::student_noise(1.0, 3.0).score(1e8, 0.0).value ==
        doctest::Approx(-4.0 * std::log(2.0)).epsilon(1e-13));
  CHECK(sy::laplace_noise(1.0).score(sy::over(1e9), 0.0).value == doctest::Approx(-1e9).epsilon(1e-8));
  CHECK(sy::poisson_count().score(sy::over(1'000'000), 1.0).value < -1e7);
  CHECK(sy::poisson_count().score(sy::under(10), 1e6).value < -9e5);
  CHECK(sy::poisson_count().score(3, 0.0).value == impossible);
  CHECK(sy::poisson_count().score(3, 1e-300).value ==
        doctest::Approx(3.0 * std::log(1e-300) - std::log(6.0)).epsilon(1e-14));
  CHECK(sy::binomial_count(10).score(3, 0.0).value == impossible);
  CHECK(sy::uniform_tolerance(1.0).score(2.0, 0.5).value == impossible);
  CHECK(sy::uniform_tolerance(1.0).score(sy::within(1.5, 3.0), 0.5).value == impossible);
  CHECK(sy::relative_noise(0.1).score(1.0, 0.0).value == impossible);
  CHECK(sy::relative_noise(0.1).score(sy::under(1.0), 0.0).value == 0.0);
  CHECK(sy::relative_noise(0.1).score(sy::over(1.0), 0.0).value == impossible);
  CHECK(sy::relative_noise(0.1).score(sy::within(-1.0, 1.0), 0.0).value == 0.0);
  CHECK(sy::lognormal_noise(0.1).score(1.0, 0.0).value == impossible);
  CHECK(sy::lognormal_noise(0.1).score(sy::under(1.0), 0.0).value == 0.0);
  CHECK(sy::exponential_life().score(1.0, 0.0).value == impossible);
  CHECK(sy::exponential_life().score(sy::over(1e9), 0.0).value == 0.0);
  // an outlier's chance takes over where the usual noise has vanished
  auto const wild = sy::with_outliers(sy::normal_noise(1.0), 0.01, sy::anywhere(-1e6, 1e6));
  CHECK(wild.score(1e5, 0.0).value == doctest::Approx(std::log(0.01 / 2e6)).epsilon(1e-14));
  CHECK(wild.score(2e6 - 1e6, 0.0).value > impossible);
  auto const never = sy::with_outliers(sy::normal_noise(1.0), 0.0, sy::normal_noise(9.0));
  CHECK(never.score(300.0, 0.0).value == sy::normal_noise(1.0).score(300.0, 0.0).value);
  auto const always = sy::with_outliers(sy::normal_noise(1.0), 1.0, sy::normal_noise(9.0));
  CHECK(always.score(300.0, 0.0).value == sy::normal_noise(9.0).score(300.0, 0.0).value);
}

TEST_CASE("one column of data may mix numbers and limits") {
  std::vector<sy::shown> const data{1.5, 2, sy::under(0.5), sy::over(9), sy::within(1.0, 2.0)};
  std::vector<std::string> const texts{"1.5", "2", "under 0.5", "over 9", "within 1 to 2"};
  for (std::size_t i = 0; i < data.size(); ++i) CHECK(data[i].text() == texts[i]);
  auto const first = sy::reading("first", data[3], &tank::level, sy::normal_noise(1.0));
  CHECK(first(tank{8.0, 0.0f, 0}).value == sy::normal_noise(1.0).score(sy::over(9.0), 8.0).value);
  sy::cell const c = sy::cell::around(1e9, 0.25).from(1e9 - 1.0);
  CHECK(c.lower == 0.75);
  CHECK(sy::cell::between(1.0, 4.0).from(0.5).centre == 2.0);
}

TEST_CASE("sums and differences of logarithms keep their digits and know impossible") {
  namespace d = sy::detail;
  CHECK(d::log_sum(std::log(3.0), std::log(4.0)) == doctest::Approx(std::log(7.0)).epsilon(1e-15));
  CHECK(d::log_sum(impossible, -3.0) == -3.0);
  CHECK(d::log_sum(impossible, impossible) == impossible);
  CHECK(d::log_sum(-1e300, -3.0) == -3.0);
  CHECK(d::log_difference(std::log(4.0), std::log(3.0)) == doctest::Approx(0.0).epsilon(1e-15));
  CHECK(d::log_difference(-3.0, impossible) == -3.0);
  CHECK(d::log_difference(-3.0, -3.0) == impossible);
  CHECK(d::log_difference(impossible, impossible) == impossible);
  CHECK(d::log_product(impossible, 3.0) == impossible);
  CHECK(d::log_product(-1e308, -1e308) == impossible);
  CHECK(d::log_complement(-1e-20) == doctest::Approx(std::log(1e-20)).epsilon(1e-15));
  CHECK(d::log_complement(-50.0) == doctest::Approx(-std::exp(-50.0)).epsilon(1e-15));
  CHECK(d::log_ratio(1e300, 1e-300) == doctest::Approx(600.0 * std::log(10.0)).epsilon(1e-15));
  // the saddle point's parts: Stirling's error at 1 and 20 from log(n!), deviance near its zero as (x - m)^2 / 2m
  CHECK(d::stirling_error(1.0) == doctest::Approx(1.0 - 0.5 * std::log(2.0 * 3.14159265358979324)).epsilon(1e-14));
  CHECK(d::stirling_error(20.0) == doctest::Approx(1.0 / 240.0 - 1.0 / 2'880'000.0).epsilon(1e-6));
  CHECK(d::deviance(1e6 + 1.0, 1e6) == doctest::Approx(0.5e-6).epsilon(1e-6));
}
