// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/student.hpp>

#include <boost/math/distributions/students_t.hpp>

#include <cmath>
#include <limits>

// Reference: Boost.Math in long double.

namespace sy = steelyard::detail;

namespace {

constexpr double degrees[] = {0.05, 0.1, 0.3,  0.5,  0.7,   1.0,   1.5,    2.0,    2.5,     3.0,  4.0, 5.0, 7.7,
                              10.0, 29.0, 30.0, 99.5, 300.0, 1000.0, 3333.0, 9999.0, 10001.0, 1e5, 1e6, 3e6, 1e8};
constexpr double tails[] = {1e-9, 1e-7, 1e-5, 1e-3, 0.005, 0.01, 0.025, 0.05, 0.1, 0.15, 0.2, 0.3, 0.4, 0.49, 0.4999};

double relative(double got, long double want) {
  return static_cast<double>(std::abs((static_cast<long double>(got) - want) / want));
}

}  // namespace

TEST_CASE("Student quantiles agree with Boost.Math to 1e-10, whole degrees of freedom or not") {
  double worst = 0.0;
  double worst_tail = 0.0;
  for (double const dof : degrees) {
    boost::math::students_t_distribution<long double> const student(dof);
    for (double const q : tails) {
      long double const want = quantile(complement(student, static_cast<long double>(q)));
      double const error = relative(sy::student_upper_quantile(q, dof), want);
      if (error > worst) worst = error;
      CHECK_MESSAGE(error < 1e-10, "dof ", dof, ", upper tail ", q);
      CHECK(sy::student_quantile(q, dof) == -sy::student_upper_quantile(q, dof));

      auto const t = static_cast<double>(want);
      long double const beyond = cdf(complement(student, static_cast<long double>(t)));
      double const miss = relative(sy::student_upper(t, dof), beyond);
      if (miss > worst_tail) worst_tail = miss;
      CHECK_MESSAGE(miss < 1e-11, "dof ", dof, ", t ", t);
    }
  }
  MESSAGE("student_upper_quantile: worst relative error ", worst, "; student_upper: ", worst_tail);
}

TEST_CASE("Student quantiles in closed form") {
  // one degree of freedom: tan(pi (p - 1/2)); two: (2p - 1) / sqrt(2 p (1 - p))
  double const pi = 3.141592653589793;
  for (double const p : {0.6, 0.9, 0.975, 0.9995}) {
    CHECK(sy::student_quantile(p, 1.0) == doctest::Approx(std::tan(pi * (p - 0.5))).epsilon(1e-12));
    CHECK(sy::student_quantile(p, 2.0) ==
          doctest::Approx((2.0 * p - 1.0) / std::sqrt(2.0 * p * (1.0 - p))).epsilon(1e-12));
  }
}

TEST_CASE("Student's t at its ends") {
  CHECK(sy::student_quantile(0.5, 3.0) == 0.0);
  CHECK(sy::student_upper(0.0, 3.0) == 0.5);
  CHECK(sy::student_cdf(1e300, 3.0) == 1.0);
  CHECK(sy::student_upper(1e300, 50.0) == 0.0);
  CHECK(sy::student_upper_quantile(1e-9, 0.01) == std::numeric_limits<double>::max());  // beyond 10^800
  CHECK(sy::student_upper_quantile(0.025, 0.0) == std::numeric_limits<double>::max());
  CHECK(sy::student_upper_quantile(0.025, 1e16) == doctest::Approx(1.959963984540054).epsilon(1e-14));
}

TEST_CASE("quantiles fall as the degrees of freedom grow, across the change of method") {
  double last = std::numeric_limits<double>::max();
  for (double const dof : {1.0, 10.0, 100.0, 1000.0, 9000.0, 9999.0, 10000.0, 10001.0, 11000.0, 1e5, 1e7}) {
    double const t = sy::student_upper_quantile(0.005, dof);
    CHECK(t < last);
    last = t;
  }
}
