// SPDX-License-Identifier: BSL-1.0
// Exponential deviates from words, many at a time.

#include <doctest/doctest.h>

#include <bit>
#include <cstdint>
#include <vector>

#include <boost/multiprecision/cpp_bin_float.hpp>

#include <steelyard/base/exponential_words.hpp>
#include <steelyard/draw/draws.hpp>

namespace sy = steelyard;
namespace detail = steelyard::detail;

namespace {

std::vector<std::uint64_t> words() {
  std::vector<std::uint64_t> all{0, 1, 4095, 4096, ~std::uint64_t{0}, ~std::uint64_t{0} - 4096, std::uint64_t{1} << 63,
                                 (std::uint64_t{1} << 63) - 1};
  sy::draws source(1);
  for (int i = 0; i < 4096 - 8; ++i) all.push_back(source() >> (i % 64));
  return all;
}

}  // namespace

TEST_CASE("exponential words: within 1.2 ulp of Boost.Multiprecision's logarithm, from the largest to the smallest") {
  using wide = boost::multiprecision::cpp_bin_float_50;
  std::vector<std::uint64_t> const w = words();
  std::vector<double> e(w.size());
  detail::exponentials_from_words(w, e);
  double worst = 0.0;
  for (std::size_t i = 0; i < w.size(); ++i) {
    wide const u = (wide(w[i] >> 12) + wide(0.5)) * boost::multiprecision::ldexp(wide(1), -52);
    wide const exact = -boost::multiprecision::log(u);
    double const ulp = std::bit_cast<double>(std::bit_cast<std::uint64_t>(static_cast<double>(exact)) + 1) - static_cast<double>(exact);
    double const off = static_cast<double>(boost::multiprecision::abs(wide(e[i]) - exact)) / ulp;
    if (off > worst) worst = off;
  }
  CAPTURE(worst);
  CHECK(worst < 1.2);
  CHECK(e[0] > 36.0);
  CHECK(e[4] > 0.0);
}

TEST_CASE("exponential words: the same bits at every width that this processor runs") {
  std::vector<std::uint64_t> const w = words();
  std::vector<double> plain(w.size());
  detail::exponentials_from_words(w, plain, detail::isa::plain);
  for (detail::isa const width : {detail::isa::sse2, detail::isa::avx2, detail::isa::avx512}) {
    if (width > detail::widest_isa()) continue;
    std::vector<double> same(w.size());
    detail::exponentials_from_words(w, same, width);
    std::size_t differ = 0;
    for (std::size_t i = 0; i < w.size(); ++i)
      if (std::bit_cast<std::uint64_t>(plain[i]) != std::bit_cast<std::uint64_t>(same[i])) ++differ;
    CHECK(differ == 0);
  }
}
