// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/elementary.hpp>

#include <boost/multiprecision/cpp_bin_float.hpp>

#include <bit>
#include <cmath>
#include <cstdint>
#include <limits>

// Reference: Boost.Multiprecision's cpp_bin_float at 50 decimal digits.
// "ulp" is the spacing of doubles at the exact result.

namespace sy = steelyard::detail;
using exact = boost::multiprecision::cpp_bin_float_50;

namespace {

constexpr double lowest = std::numeric_limits<double>::lowest();

double ulps(double got, exact const& want) {
  int exponent = 0;
  static_cast<void>(frexp(want, &exponent));
  if (exponent < -1021) exponent = -1021;
  return std::abs(static_cast<double>((exact(got) - want) / ldexp(exact(1), exponent - 53)));
}

// A sequence that fills (0, 1) evenly: fractions of multiples of the golden ratio.
struct even {
  double u = 0.0;
  double operator()() { return u = std::fmod(u + 0.6180339887498949, 1.0); }
};

// Programs linked with -ffast-math may run with subnormal numbers flushed to zero.
bool keeps_subnormals() {
  double volatile tiny = std::numeric_limits<double>::min();
  double volatile half = 0.5;
  return tiny * half > 0.0;
}

struct worst {
  double error = 0.0;
  double at = 0.0;
  void see(double e, double x) {
    if (e > error) error = e, at = x;
  }
};

}  // namespace

TEST_CASE("portable_exp is within 1.1 ulp from its largest argument to its vanishing") {
  even u;
  worst w;
  double const low = keeps_subnormals() ? -745.13 : -708.39;
  for (int k = 0; k < 6000; ++k) {
    double const x = k % 2 == 0 ? low + u() * (709.78 - low) : (u() - 0.5) * 4.0;
    w.see(ulps(sy::portable_exp(x), exp(exact(x))), x);
  }
  MESSAGE("portable_exp: worst ", w.error, " ulp at ", w.at);
  CHECK(w.error < 1.1);
}

TEST_CASE("portable_exp at its ends") {
  CHECK(sy::portable_exp(0.0) == 1.0);
  CHECK(sy::portable_exp(-0.0) == 1.0);
  CHECK(sy::portable_exp(-746.0) == 0.0);
  CHECK(sy::portable_exp(-1e300) == 0.0);
  CHECK(sy::portable_exp(lowest) == 0.0);
  CHECK(sy::portable_exp(709.782712893384) < std::numeric_limits<double>::max());
  CHECK(ulps(sy::portable_exp(709.782712893384), exp(exact(709.782712893384))) < 1.1);
  CHECK(sy::portable_exp(709.79) == std::numeric_limits<double>::max());
  CHECK(sy::portable_exp(1e300) == std::numeric_limits<double>::max());
  if (keeps_subnormals()) {
    CHECK(sy::portable_exp(-745.13) == std::numeric_limits<double>::denorm_min());
    CHECK(sy::portable_exp(-745.2) == 0.0);
  }
}

TEST_CASE("portable_expm1 is within 1.5 ulp, near zero too") {
  even u;
  worst w;
  for (int k = 0; k < 6000; ++k) {
    double x = (u() - 0.5) * 3.0;
    if (k % 3 == 1) x = -40.0 + u() * 740.0;
    if (k % 3 == 2) x = std::ldexp(u() - 0.5, -static_cast<int>(u() * 300.0));
    w.see(ulps(sy::portable_expm1(x), boost::multiprecision::expm1(exact(x))), x);
  }
  MESSAGE("portable_expm1: worst ", w.error, " ulp at ", w.at);
  CHECK(w.error < 1.5);
  CHECK(sy::portable_expm1(0.0) == 0.0);
  CHECK(sy::portable_expm1(-800.0) == -1.0);
}

TEST_CASE("portable_log is within 1.1 ulp, subnormal arguments included") {
  even u;
  worst w;
  for (int k = 0; k < 6000; ++k) {
    double const x = k % 2 == 0 ? std::ldexp(1.0 + u(), static_cast<int>(u() * 2045.0) - 1022) : 0.4 + u() * 2.0;
    w.see(ulps(sy::portable_log(x), log(exact(x))), x);
  }
  for (std::uint64_t bits = 1; bits < (std::uint64_t{1} << 52); bits = bits * 3 + 1) {  // subnormal, by their bits
    exact const value = ldexp(exact(bits), -1074);
    double const got = sy::portable_log(std::bit_cast<double>(bits));
    w.see(ulps(got, log(value)), static_cast<double>(bits));
  }
  MESSAGE("portable_log: worst ", w.error, " ulp at ", w.at);
  CHECK(w.error < 1.1);
}

TEST_CASE("portable_log at its ends: no infinities, nothing lost") {
  double const infinity = std::bit_cast<double>(0x7ff0000000000000u);
  double const nan = std::bit_cast<double>(0x7ff8000000000000u);
  CHECK(sy::portable_log(1.0) == 0.0);
  CHECK(sy::portable_log(0.0) == lowest);
  CHECK(sy::portable_log(-0.0) == lowest);
  CHECK(sy::portable_log(-1.0) == lowest);
  double const of_infinity = sy::portable_log(infinity);
  CHECK(sy::is_plus_infinite(of_infinity));
  double const of_nan = sy::portable_log(nan);
  CHECK(sy::is_nan(of_nan));
}

TEST_CASE("portable_log1p is within 1.5 ulp, near zero too") {
  even u;
  worst w;
  for (int k = 0; k < 6000; ++k) {
    double x = -0.999 + u() * 3.0;
    if (k % 3 == 1) x = std::ldexp(u() - 0.5, -static_cast<int>(u() * 300.0));
    if (k % 3 == 2) x = std::ldexp(0.5 + u(), static_cast<int>(u() * 1000.0));
    w.see(ulps(sy::portable_log1p(x), boost::multiprecision::log1p(exact(x))), x);
  }
  MESSAGE("portable_log1p: worst ", w.error, " ulp at ", w.at);
  CHECK(w.error < 1.5);
  CHECK(sy::portable_log1p(0.0) == 0.0);
  CHECK(sy::portable_log1p(-1.0) == lowest);
  CHECK(sy::portable_log1p(-2.0) == lowest);
}

TEST_CASE("portable_sqrt rounds to nearest") {
  even u;
  for (int k = 0; k < 2000; ++k) {
    double const x = std::ldexp(1.0 + u(), static_cast<int>(u() * 2000.0) - 1000);
    CHECK(ulps(sy::portable_sqrt(x), sqrt(exact(x))) <= 0.5);
  }
  CHECK(sy::portable_sqrt(0.0) == 0.0);
}

