// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/bits.hpp>

#include <bit>
#include <cstdint>
#include <initializer_list>
#include <limits>

namespace bits = steelyard::detail;

namespace {

// The encodings of IEEE 754 binary64, made at run time so that no flag can fold the tests below.
double from_bits(std::uint64_t u) {
  std::uint64_t volatile made = u;
  return std::bit_cast<double>(std::uint64_t{made});
}

}  // namespace

TEST_CASE("NaN and infinities are told from numbers under every flag") {
  double const nan = from_bits(0x7ff8000000000000u);
  double const other_nan = from_bits(0xfff0000000000001u);
  double const infinity = from_bits(0x7ff0000000000000u);
  double const minus_infinity = from_bits(0xfff0000000000000u);
  for (double const& x : {nan, other_nan}) {
    CHECK(bits::is_nan(x));
    CHECK(!bits::is_finite(x));
    CHECK(!bits::is_plus_infinite(x));
    CHECK(!bits::is_minus_infinite(x));
  }
  CHECK(bits::is_plus_infinite(infinity));
  CHECK(!bits::is_minus_infinite(infinity));
  CHECK(bits::is_minus_infinite(minus_infinity));
  CHECK(!bits::is_plus_infinite(minus_infinity));
  CHECK(!bits::is_finite(infinity));
  CHECK(!bits::is_finite(minus_infinity));
  CHECK(!bits::is_nan(infinity));
  CHECK(!bits::is_nan(minus_infinity));
  std::uint64_t const numbers[] = {0x0000000000000000u, 0x8000000000000000u, 0x0000000000000001u,
                                   0x3ff0000000000000u, 0x7fefffffffffffffu, 0xffefffffffffffffu};
  for (std::uint64_t const u : numbers) {
    double const x = from_bits(u);
    CHECK(bits::is_finite(x));
    CHECK(!bits::is_nan(x));
    CHECK(!bits::is_plus_infinite(x));
    CHECK(!bits::is_minus_infinite(x));
  }
}

TEST_CASE("the tests hold for what comes out of arithmetic") {
  double volatile zero = 0.0;
  double volatile largest = std::numeric_limits<double>::max();
  double const infinite = largest * 2.0;
  CHECK(bits::is_plus_infinite(infinite));
  double const none = zero / zero;
  CHECK(bits::is_nan(none));
}

TEST_CASE("a fenced product is rounded before it is added") {
  // (1 + e)(1 - e) = 1 - e^2 rounds to 1 for e = 2^-30; a fused multiply-add would leave -e^2
  double volatile a = 1.0 + 0x1p-30;
  double volatile b = 1.0 - 0x1p-30;
  double const x = a;
  double const y = b;
  CHECK(bits::plus(bits::times(x, y), -1.0) == 0.0);
}

TEST_CASE("a fenced sum is not reordered or cancelled") {
  double volatile big = 0x1p60;
  double volatile small = 1.0;
  double const x = big;
  double const y = small;
  CHECK(bits::minus(bits::plus(x, y), x) == 0.0);
}

TEST_CASE("powers of two") {
  CHECK(bits::power_of_two(0) == 1.0);
  CHECK(bits::power_of_two(-1022) == std::numeric_limits<double>::min());
  CHECK(bits::power_of_two(1023) == 0x1p1023);
}
