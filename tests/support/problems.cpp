// SPDX-License-Identifier: BSL-1.0
#include "statistics/problems.hpp"

#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/lognormal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/distributions/uniform.hpp>

#include <cmath>
#include <string>
#include <vector>

// The table of the problems, compiled once for all programs that ask them.

namespace known {

namespace {

posterior beta(double a, double b, double log_evidence) {
  return known_as(boost::math::beta_distribution<double, quiet>(a, b), log_evidence);
}
posterior gamma(double shape, double rate, double log_evidence) {
  return known_as(boost::math::gamma_distribution<double, quiet>(shape, 1.0 / rate), log_evidence);
}
posterior lognormal(double mean, double sd, double log_evidence) {
  return known_as(boost::math::lognormal_distribution<double, quiet>(mean, sd), log_evidence);
}
posterior uniform(double low, double high, double log_evidence) {
  return known_as(boost::math::uniform_distribution<double, quiet>(low, high), log_evidence);
}
posterior student(double degrees) {
  return known_as(boost::math::students_t_distribution<double, quiet>(degrees), 0.0);
}
/// Gamma prior, a likelihood r^k e^(-t r) times a constant.
posterior gamma_given(double shape, double rate, double k, double t, double log_constant) {
  return gamma(shape + k, rate + t,
               log_constant + shape * std::log(rate) - log_gamma(shape) + log_gamma(shape + k) -
                   (shape + k) * std::log(rate + t));
}

}  // namespace

std::vector<problem> const& problems() {
  auto const of_log = [](double reading, double sd) {
    return scored([=](double x) { return log_normal_density(reading, std::log(x), sd); });
  };
  auto const events = [](double k, double t, double log_constant) {  // k events in a time t at rate x
    return [=](double x) { return k * std::log(x) - t * x + log_constant; };
  };
  auto const thrice_in_20 = [](double x) { return 3.0 * std::log(x) + 17.0 * std::log1p(-x); };
  auto const display = rounded_score(1.0, 0.5, 0.1);
  auto const of_square = [](double x) { return log_normal_density(1.0, x * x, 0.2); };
  auto const detected = [](double x) {  // three times of four, with chance P(Z <= x)
    return 3.0 * std::log(normal_below(x)) + std::log(normal_below(-x));
  };
  auto const wide_to_narrow = [](point const& p) {
    return 7.0 * std::exp(log_normal_density(p.x, 0.0, 1.0) - log_normal_density(p.x, 0.0, 2.0));
  };
  auto const to_mean_5 = [](point const& p) { return std::pow(5.0 / 4.0, p.x); };  // Poisson 4 to Poisson 5
  auto const one = [](point const&) { return 1.0; };
  auto const whole = [](double x) { return log_normal_density(6.0, x, 1.5); };
  auto const whole_given = [=](double prior) { return by_sum([=](double k) { return log_poisson(k, prior) + whole(k); }, 80); };
  auto const positive = [](point const& p) { return p.x > 0.0; };
  auto const all = even_groups(1);
  auto const at_05 = [](double x) { return log_normal_density(0.5, x, 0.5); };

  // horse kicks: 196 in 280 corps-years [Bortkiewicz 1898]; censored lives: 9 in 359 weeks [Freireich 1963, Gehan 1965]
  // clang-format off
  static std::vector<problem> const table = {
      // name, how it is drawn and weighed, exact posterior
      {"wide normal", piped(normal_prior(0, 1), normal_reading(1, 1)), normal_given(1, 1), 0.1, true},
      {"sharp normal", piped(normal_prior(0, 1), normal_reading(3, 0.5)), normal_given(3, 0.5)},
      {"rare event in a narrow posterior", piped(normal_prior(0, 1), normal_reading(1, 0.1)), normal_given(1, 0.1), 0.02, true},
      {"very sharp normal", piped(normal_prior(0, 1), normal_reading(0.5, 0.02)), normal_given(0.5, 0.02)},
      {"lognormal", piped(lognormal_prior(0, 1), of_log(0.8, 0.5)), lognormal(0.64, std::sqrt(0.2), log_normal_density(0.8, 0, std::sqrt(1.25))), 0.1, true},
      {"lognormal, no reading", piped(lognormal_prior(0, 1), no_reading()), lognormal(0, 1, 0)},
      {"Student 5, no reading", piped(student_prior(5), no_reading()), student(5)},
      {"exponential, no reading", piped(gamma_prior(1, 1), no_reading()), gamma(1, 1, 0), 0.02},
      {"uniform, no reading", piped(uniform_prior(1, 3), no_reading()), uniform(1, 3, 0)},
      {"window", piped(uniform_prior(0, 1), window(0.2, 0.5)), uniform(0.2, 0.5, std::log(0.3))},
      {"narrow window", piped(uniform_prior(0, 1), window(0.20, 0.23)), uniform(0.20, 0.23, std::log(0.03))},
      {"counts of a rate", piped(gamma_prior(2, 0.5), scored(events(7, 1, -log_gamma(8)))), gamma_given(2, 0.5, 7, 1, -log_gamma(8))},
      {"horse kicks", piped(gamma_prior(2, 2), scored(events(196, 280, 0))), gamma_given(2, 2, 196, 280, 0)},
      {"censored lives", piped(gamma_prior(1, 10), scored(events(9, 359, 0))), gamma_given(1, 10, 9, 359, 0)},
      {"share of defects", piped(uniform_prior(0, 1), scored(thrice_in_20)), beta(4, 18, log_gamma(4) + log_gamma(18) - log_gamma(22))},
      {"rounded reading", piped(normal_prior(0, 1), scored(display)), normal_under(display, -1, 3), 0.1, true},
      {"hit and miss", piped(normal_prior(0, 1), scored(detected)), normal_under(detected, -6, 6)},
      {"weights without bound", piped(gamma_prior(1, 1), scored([](double x) { return 0.2 * x; })), gamma(1, 0.8, -std::log(0.8))},
      {"weights of tail 0.3", piped(gamma_prior(1, 1), scored([](double x) { return 0.3 * x; })), gamma(1, 0.7, -std::log(0.7))},
      {"twenty numbers", piped(first_of(20), normal_reading_of_y(6, 2)), normal(6.0 / 24, std::sqrt(1 - 1.0 / 24), log_normal_density(6, 0, std::sqrt(24)))},
      {"read through another", piped(pair_of(0.8), normal_reading_of_y(1, 0.5)), normal(0.64, std::sqrt(1 - 0.64 * 0.8), log_normal_density(1, 0, std::sqrt(1.25)))},
      {"two modes", piped(normal_prior(0, 1), scored(of_square)), normal_under(of_square, -3, 3)},
      {"failed runs", piped(failing_below(-0.5), normal_reading(0.5, 0.5)), normal_under(at_05, -0.5, 7)},
      {"given an event", changed(piped(normal_prior(0, 1), normal_reading(0.5, 0.5)), [=](auto const& s) { return s.given(positive); }), normal_under(at_05, 0, 7, std::log(2))},
      {"weighed again", changed(piped(normal_prior(0, 1), normal_reading(-1, 0.3)), [](auto const& s) { return s.reweigh(weighter_of_points(normal_reading(1, 0.5))); }), normal_given(1, 0.5)},
      {"prior weights", with_prior_weights(normal_prior(0, 2), wide_to_narrow, normal_reading(1, 0.5)), normal_given(1, 0.5), 0.1, true},
      {"whole numbers", piped(poisson_prior(4), scored(whole)), whole_given(4)},
      {"whole numbers, counted", counted(all, poisson_member(0, 4), one, scored(whole)), whole_given(4), 0.1, true},
      {"prior weights, counts and 300 groups", counted(even_groups(300), poisson_member(1, 3), to_mean_5, scored(whole)), whole_given(5)},
      {"200 groups", grouped(even_groups(200), normal_member(0.5), normal_reading(1, 1)), normal_given(1, 1), 0.1, true},
      {"200 uneven groups", grouped(uneven_groups(200), normal_member(0.3), normal_reading(1, 1)), normal_given(1, 1)},
      {"16 groups, no reading", grouped(even_groups(16), normal_member(0.5), no_reading()), normal(0, 1, 0)},
      {"16 groups", grouped(even_groups(16), normal_member(0.2), normal_reading(1, 2)), normal_given(1, 2), 0.1, true},
      {"16 groups, sharper reading", grouped(even_groups(16), normal_member(0.5), normal_reading(1, 1)), normal_given(1, 1)},
      {"8 groups", grouped(even_groups(8), normal_member(0.1), normal_reading(1, 2)), normal_given(1, 2)},
  };
  // clang-format on
  return table;
}

}  // namespace known
