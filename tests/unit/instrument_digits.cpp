// SPDX-License-Identifier: BSL-1.0
// Scores against references computed here in 50 digits (Boost.Multiprecision),
// from the defining formulas. The error is |score - reference| / max(1, |reference|);
// the worst row of each instrument is printed and held to a stated limit.

#include <algorithm>
#include <cmath>
#include <map>
#include <sstream>
#include <string>

#include <doctest/doctest.h>
#include <boost/math/special_functions/erf.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/multiprecision/cpp_bin_float.hpp>

#include <steelyard/instrument/instruments.hpp>

namespace sy = steelyard;
using mp = boost::multiprecision::cpp_bin_float_50;

namespace {

class worst_row {
 public:
  explicit worst_row(std::string instrument) : instrument_(std::move(instrument)) {}

  template <class... Inputs>
  void add(sy::log_likelihood got, mp const& reference, Inputs const&... inputs) {
    double const size = std::max(1.0, std::abs(static_cast<double>(reference)));
    double const error = std::abs(static_cast<double>(mp(got.value) - reference)) / size;
    ++rows_;
    if (error < worst_) return;
    worst_ = error;
    std::ostringstream text;
    text.precision(17);
    ((text << inputs << ' '), ...);
    text << ": " << got.value << " for " << static_cast<double>(reference);
    row_ = text.str();
  }
  double report() const {
    MESSAGE(instrument_ << ", " << rows_ << " rows, worst " << worst_ << ": " << row_);
    return worst_;
  }

 private:
  std::string instrument_;
  std::string row_;
  double worst_ = 0.0;
  int rows_ = 0;
};

// Sums that -ffast-math puts in another order round otherwise: twice the error is allowed there.
#if defined(__FAST_MATH__)
constexpr double reordered = 2.0;
#else
constexpr double reordered = 1.0;
#endif

mp const pi = boost::math::constants::pi<mp>();

/// log Gamma(x), each value found once
mp const& log_gamma(mp const& x) {
  static std::map<mp, mp> known;
  auto const [place, fresh] = known.try_emplace(x);
  if (fresh) place->second = boost::math::lgamma(x);
  return place->second;
}
mp normal_above(mp const& z) { return boost::math::erfc(mp(z / sqrt(mp(2)))) / 2; }
mp log_normal_density(mp const& z) { return -z * z / 2 - log(2 * pi) / 2; }
/// P(a < Z < b), in the tail that loses nothing
mp normal_between(mp const& a, mp const& b) {
  return a + b > 0 ? normal_above(a) - normal_above(b) : normal_above(-b) - normal_above(-a);
}

/// log I_x(a, b) by DLMF 8.17.22
mp log_beta_below(mp const& a, mp const& b, mp const& x) {
  mp c = 1, d = 1 / (1 - (a + b) * x / (a + 1)), f = d;
  for (int k = 1; k < 1'000'000; ++k) {
    mp const m = k, even = m * (b - m) * x / ((a + 2 * m - 1) * (a + 2 * m));
    d = 1 / (1 + even * d);
    c = 1 + even / c;
    f *= c * d;
    mp const odd = -(a + m) * (a + b + m) * x / ((a + 2 * m) * (a + 2 * m + 1));
    d = 1 / (1 + odd * d);
    c = 1 + odd / c;
    f *= c * d;
    if (abs(c * d - 1) < mp(1e-45)) break;
  }
  return a * log(x) + b * log(1 - x) - log(a) - log_gamma(a) - log_gamma(b) + log_gamma(a + b) + log(f);
}
mp beta_below(mp const& a, mp const& b, mp const& x) {
  return x < (a + 1) / (a + b + 2) ? mp(exp(log_beta_below(a, b, x))) : mp(1 - exp(log_beta_below(b, a, 1 - x)));
}
mp student_above(mp const& z, mp const& dof) {
  if (z < 0) return 1 - student_above(-z, dof);
  if (z == 0) return mp(0.5);
  return beta_below(dof / 2, mp(0.5), dof / (dof + z * z)) / 2;
}
mp log_student_density(mp const& z, mp const& dof) {
  return log_gamma(mp((dof + 1) / 2)) - log_gamma(mp(dof / 2)) - log(pi * dof) / 2 -
         (dof + 1) / 2 * log(1 + z * z / dof);
}

/// P(a, x) and Q(a, x) by series and continued fraction
mp gamma_below(mp const& a, mp const& x);
mp gamma_above(mp const& a, mp const& x) {
  if (x < a + 1) return 1 - gamma_below(a, x);
  mp f = x + 1 - a, c = f, d = 0;
  for (int k = 1; k < 4'000'000; ++k) {
    mp const top = -k * (k - a), bottom = x + 2 * k + 1 - a;
    d = 1 / (bottom + top * d);
    c = bottom + top / c;
    f *= c * d;
    if (abs(c * d - 1) < mp(1e-45)) break;
  }
  return exp(a * log(x) - x - log_gamma(a)) / f;
}
mp gamma_below(mp const& a, mp const& x) {
  if (x <= 0) return 0;
  if (x >= a + 1) return 1 - gamma_above(a, x);
  mp term = 1, sum = 1;
  for (int k = 1; k < 4'000'000 && term > sum * mp(1e-48); ++k) {
    term *= x / (a + k);
    sum += term;
  }
  return exp(a * log(x) - x - log_gamma(a + 1)) * sum;
}

double const half_widths[] = {1e-12, 1e-6, 1e-3, 0.05, 0.2, 0.5, 1.0, 3.0, 20.0, 500.0};
double const distances[] = {0.0, 1e-9, 0.3, 1.0, 3.0, 5.0, 8.0, 11.9, 12.1, 20.0, 37.0, 38.7, 60.0, 300.0};

}  // namespace

TEST_CASE("normal noise: density, tails and intervals to 60 sigma and beyond") {
  worst_row density("normal_noise density"), tails("normal_noise tails"), around("normal_noise intervals");
  for (double const sd : {0.02, 1.0, 3.7}) {
    auto const instrument = sy::normal_noise(sd);
    for (double const distance : distances) {
      double const truth = 2.3, x = truth + distance * sd;
      mp const z = (mp(x) - mp(truth)) / mp(sd);
      density.add(instrument.score(x, truth), log_normal_density(z) - log(mp(sd)), sd, x);
      tails.add(instrument.score(sy::over(x), truth), log(normal_above(z)), sd, x, "over");
      tails.add(instrument.score(sy::under(x), truth), log(normal_above(-z)), sd, x, "under");
      for (double const half : half_widths) {
        double const a = x - half * sd, b = x + half * sd;
        if (!(b > a)) continue;
        mp const exact = normal_between((mp(a) - mp(truth)) / mp(sd), (mp(b) - mp(truth)) / mp(sd));
        around.add(instrument.score(sy::within(a, b), truth), log(exact), sd, a, b);
      }
    }
  }
  CHECK(density.report() < 1e-15);
  CHECK(tails.report() < 1e-15);
  CHECK(around.report() < 2e-15);
}

TEST_CASE("a display's cell is taken by its middle and step, so that narrow cells far out keep their digits") {
  worst_row row("rounded(step, normal_noise)");
  for (double const step : {1e-12, 1e-7, 0.1, 1.0, 10.0})
    for (double const cell : {0.0, 3.0, 1e4, 1e8}) {
      double const sd = 0.02, x = cell * step;
      double const truth = sy::detail::fence(x - 60.0 * sd);  // the rounded number, also under -ffast-math
      auto const got = sy::rounded(step, sy::normal_noise(sd)).score(x, truth);
      mp const centre = mp(x) - mp(truth), half = mp(step) / 2;
      row.add(got, log(normal_between((centre - half) / mp(sd), (centre + half) / mp(sd))), step, cell);
    }
  CHECK(row.report() < 2e-15);
}

TEST_CASE("two-part and lognormal noise") {
  worst_row two("two_part_noise"), density("lognormal_noise density"), around("lognormal_noise tails and intervals");
  for (double const truth : {1e-3, 0.7, 40.0, 1e6})
    for (double const distance : distances) {
      mp const variance = mp(0.3) * mp(0.3) + mp(0.02) * mp(0.02) * mp(truth) * mp(truth);
      double const x = truth - distance * std::sqrt(static_cast<double>(variance));
      two.add(sy::two_part_noise({.absolute = 0.3, .relative = 0.02}).score(x, truth),
              log_normal_density((mp(x) - mp(truth)) / sqrt(variance)) - log(variance) / 2, truth, x);
      for (double const sign : {-1.0, 1.0}) {
        double const s = 0.125, y = truth * std::exp(sign * distance * s);
        auto const instrument = sy::lognormal_noise(s);
        auto const z = [&](mp const& at) { return mp(log(at / mp(truth)) / mp(s)); };
        density.add(instrument.score(y, truth), log_normal_density(z(y)) - log(mp(s)) - log(mp(y)), truth, y);
        around.add(instrument.score(sy::over(y), truth), log(normal_above(z(y))), truth, y, "over");
        for (double const half : {1e-12, 1e-6, 0.1, 0.9}) {
          double const a = y - half * y, b = y + half * y;
          around.add(instrument.score(sy::within(a, b), truth), log(normal_between(z(a), z(b))), truth, a, b);
        }
      }
    }
  CHECK(two.report() < 2e-15 * reordered);
  CHECK(density.report() < 3e-15);
  CHECK(around.report() < 1e-14);
}

TEST_CASE("Laplace, triangular, uniform and exponential: intervals") {
  worst_row laplace("laplace_noise"), triangle("triangular_noise"), flat("uniform_tolerance"), life("exponential_life");
  auto const laplace_above = [](mp const& z) { return mp(z > 0 ? mp(exp(-z) / 2) : mp(1 - exp(z) / 2)); };
  for (double const distance : distances)
    for (double const half : half_widths) {
      double const a = distance - half, b = distance + half;
      if (!(b > a)) continue;
      mp const exact = a + b > 0 ? laplace_above(a) - laplace_above(b) : laplace_above(-b) - laplace_above(-a);
      laplace.add(sy::laplace_noise(1.0).score(sy::within(a, b), 0.0), log(exact), a, b);
      if (a > 0.0)
        life.add(sy::exponential_life().score(sy::within(a, b), 0.7),
                 log(exp(-mp(0.7) * mp(a)) - exp(-mp(0.7) * mp(b))), a, b);
      auto const area = [](double z) {  // of the triangle from 0 to z >= 0
        mp const end = z < 1.0 ? mp(z) : mp(1);
        return mp(end * (2 - end) / 2);
      };
      double const c = 0.3 * distance, from = c - half, to = c + half;
      mp const inside = from >= 0.0 ? area(to) - area(from) : area(to) + area(-from);
      if (inside > 0) triangle.add(sy::triangular_noise(1.0).score(sy::within(from, to), 0.0), log(inside), from, to);
      mp const upper = to < 1.0 ? mp(to) : mp(1), lower = from > -1.0 ? mp(from) : mp(-1);
      if (upper > lower)
        flat.add(sy::uniform_tolerance(1.0).score(sy::within(from, to), 0.0), log((upper - lower) / 2), from, to);
    }
  CHECK(laplace.report() < 1e-15);
  CHECK(triangle.report() < 1e-15);
  CHECK(flat.report() < 1e-15);
  CHECK(life.report() < 1e-15);
}

TEST_CASE("Student noise: density, tails and intervals, from half a degree of freedom to a hundred million") {
  worst_row density("student_noise density"), tails("student_noise tails"), around("student_noise intervals");
  for (double const dof : {0.5, 1.0, 3.0, 30.0, 1e3, 1e6, 1e8}) {
    auto const instrument = sy::student_noise(1.0, dof);
    for (double const z : distances) {
      density.add(instrument.score(z, 0.0), log_student_density(z, dof), dof, z);
      tails.add(instrument.score(sy::over(z), 0.0), log(student_above(z, dof)), dof, z);
      for (double const half : half_widths) {
        double const a = z - half, b = z + half;
        if (!(b > a)) continue;
        mp const exact =
            a + b > 0 ? student_above(a, dof) - student_above(b, dof) : student_above(-b, dof) - student_above(-a, dof);
        around.add(instrument.score(sy::within(a, b), 0.0), log(exact), dof, a, b);
      }
    }
  }
  CHECK(density.report() < 1e-14);
  CHECK(tails.report() < 1e-14);
  CHECK(around.report() < 2e-13);
}

TEST_CASE("counts: probabilities from one count to a thousand million, tails") {
  worst_row poisson("poisson_count"), poisson_tails("poisson_count tails"), binomial("binomial_count"),
      binomial_tails("binomial_count tails"), scattered("negative_binomial_count"),
      scattered_tails("negative_binomial_count tails");
  for (double const mean : {1e-8, 0.3, 7.0, 4321.5, 1e6, 1e9})
    for (double const z : {-60.0, -5.0, -0.3, 0.0, 0.4, 6.0, 60.0}) {
      double const n = std::max(0.0, std::floor(mean + z * std::sqrt(mean)));
      auto const instrument = sy::poisson_count();
      poisson.add(instrument.score(n, mean), mp(n) * log(mp(mean)) - mp(mean) - log_gamma(mp(n + 1)), mean, n);
      if (mean > 1e8) continue;
      poisson_tails.add(instrument.score(sy::over(n), mean), log(gamma_below(n + 1, mean)), mean, n, "over");
      if (n > 0.0) poisson_tails.add(instrument.score(sy::under(n), mean), log(gamma_above(n, mean)), mean, n, "under");
      double const last = n + std::floor(std::sqrt(mean));
      if (last > n) {
        mp const exact = n > mean ? mp(gamma_below(n, mean) - gamma_below(last + 1, mean))
                                  : mp(gamma_above(last + 1, mean) - (n > 0.0 ? gamma_above(n, mean) : mp(0)));
        poisson_tails.add(instrument.score(sy::within(n, last), mean), log(exact), mean, n, last);
      }
    }
  for (double const trials : {1.0, 20.0, 493'472.0, 1e9})
    for (double const p : {1e-9, 0.25, 0.4902911944, 1.0 - 1e-7})
      for (double const z : {-40.0, -3.0, 0.0, 5.0, 60.0}) {
        double const n = std::clamp(std::floor(trials * p + z * std::sqrt(trials * p * (1.0 - p))), 0.0, trials);
        auto const instrument = sy::binomial_count(static_cast<std::uint64_t>(trials));
        mp const choose = log_gamma(mp(trials + 1)) - log_gamma(mp(n + 1)) - log_gamma(mp(trials - n + 1));
        binomial.add(instrument.score(n, p), choose + mp(n) * log(mp(p)) + mp(trials - n) * log(1 - mp(p)), trials, p,
                     n);
        if (n < trials && trials < 1e8)
          binomial_tails.add(instrument.score(sy::over(n), p), log(beta_below(n + 1, trials - n, p)), trials, p, n);
      }
  for (double const size : {0.3, 4.0, 1e3, 1e8})
    for (double const mean : {0.01, 6.0, 1e4})
      for (double const z : {-5.0, 0.0, 1.0, 10.0}) {
        double const n = std::max(0.0, std::floor(mean + z * std::sqrt(mean + mean * mean / size)));
        auto const instrument = sy::negative_binomial_count(size);
        mp const s = size, m = mean, p = s / (s + m), q = m / (s + m);
        mp const choose = log_gamma(mp(s + n)) - log_gamma(mp(n + 1)) - log_gamma(s);
        scattered.add(instrument.score(n, mean), choose + s * log(p) + mp(n) * log(q), size, mean, n);
        scattered_tails.add(instrument.score(sy::over(n), mean), log(beta_below(n + 1, s, q)), size, mean, n);
      }
  CHECK(poisson.report() < 2e-15);
  CHECK(poisson_tails.report() < 1e-13);
  CHECK(binomial.report() < 1e-12);  // trials p is itself rounded: (n - trials p) / sqrt(trials) of an ulp
  CHECK(binomial_tails.report() < 1e-13);
  CHECK(scattered.report() < 5e-15);
  CHECK(scattered_tails.report() < 1e-13);
}

TEST_CASE("counter with dead time: the law of the count without a difference of two near ones") {
  worst_row row("dead_time_counter");
  for (double const dead : {1e-6, 0.01, 0.3})
    for (double const rate : {0.01, 2.0, 50.0, 3000.0}) {
      auto const instrument = sy::dead_time_counter({.dead_time = dead, .counting_time = 1.0});
      double const top = instrument.highest_reading(), mean = instrument.mean(rate), sd = instrument.sd(rate);
      for (double const z : {-1e9, -30.0, -4.0, 0.0, 3.0, 30.0, 1e9}) {
        double const n = std::clamp(std::floor(mean + z * sd), 0.0, std::min(top, std::floor(mean + 60.0 * sd)));
        // P(N = n) = P(N >= n) - P(N >= n + 1), each the chance that n (n + 1) waiting and n - 1 (n) dead times fit
        auto const live = [&](double k) { return mp(rate) * (1 - mp(k) * mp(dead)); };
        auto const fits = [&](double k) { return k <= 0.0 ? mp(1) : gamma_below(k, live(k - 1.0)); };
        auto const fails = [&](double k) {
          return k <= 0.0 ? mp(0) : live(k - 1.0) > 0 ? gamma_above(k, live(k - 1.0)) : mp(1);
        };
        mp const exact = n > mean ? fits(n) - fits(n + 1.0) : fails(n + 1.0) - fails(n);
        if (exact > 0) row.add(instrument.score(n, rate), log(exact), dead, rate, n);
      }
    }
  CHECK(row.report() < 1e-12);
}

TEST_CASE("correlated readings and hits: against the plain formulas") {
  worst_row row("correlated_noise"), hits("hit_miss");
  for (double const rho : {-0.9, 0.0, 0.5, 0.999999})
    for (double const distance : {0.0, 1.0, 60.0}) {
      double const c = rho * 2.0 * 0.5;
      auto const instrument = sy::correlated_noise({{4.0, c}, {c, 0.25}});
      std::array<double, 2> const x{1.0 + distance, -0.5 * distance}, truth{1.0, 0.0};
      mp const det = mp(4.0) * mp(0.25) - mp(c) * mp(c), a = mp(x[0]) - 1, b = x[1];
      mp const form = (mp(0.25) * a * a - 2 * mp(c) * a * b + 4 * b * b) / det;
      row.add(instrument.score(x, truth), -form / 2 - log(det) / 2 - log(2 * pi), rho, distance);
    }
  for (double const size : {1e-12, 0.1, 1.0, 7.0, 1e9}) {
    auto const inspection = sy::hit_miss({.half = 1.2, .slope = 3.5, .false_calls = 0.0});
    mp const odds = exp(mp(3.5) * log(mp(size) / mp(1.2)));
    hits.add(inspection.score(true, size), log(odds / (1 + odds)), "hit", size);
    hits.add(inspection.score(false, size), -log(1 + odds), "miss", size);
  }
  CHECK(row.report() < 1e-9);  // rho of 0.999999 takes six digits off the determinant
  CHECK(hits.report() < 2e-15);
}
