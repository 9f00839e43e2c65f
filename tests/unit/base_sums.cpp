// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/bits.hpp>
#include <steelyard/base/sums.hpp>

#include <cmath>
#include <string>

namespace sy = steelyard::detail;

namespace {

// Shows the shape of the tree.
struct shape {
  std::string text;
  shape& operator+=(shape const& other) {
    text = "(" + text + other.text + ")";
    return *this;
  }
};

struct fenced {
  double value = 0.0;
  fenced& operator+=(fenced const& other) {
    value = sy::plus(value, other.value);
    return *this;
  }
};

}  // namespace

TEST_CASE("the tree depends on the term's place alone") {
  sy::pairwise_sum<shape> sum;
  CHECK(sum.total().text.empty());
  for (char const* name : {"a", "b", "c", "d", "e", "f", "g"}) sum.add({name});
  CHECK(sum.size() == 7);
  CHECK(sum.total().text == "(((ab)(cd))((ef)g))");
  sum.add({"h"});
  CHECK(sum.total().text == "(((ab)(cd))((ef)(gh)))");
}

TEST_CASE("rounding errors do not pile up") {
  // the double nearest to 0.1 is 0.1 + 5.6e-18, so 10^6 of them make 100 000 + 5.6e-12
  sy::pairwise_sum<fenced> sum;
  double plain = 0.0;
  for (int k = 0; k < 1'000'000; ++k) {
    sum.add({0.1});
    plain = sy::plus(plain, 0.1);
  }
  CHECK(std::abs(sum.total().value - 100'000.0) < 1e-9);
  CHECK(std::abs(plain - 100'000.0) > 1e-7);
}
