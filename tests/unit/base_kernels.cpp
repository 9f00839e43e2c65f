// SPDX-License-Identifier: BSL-1.0
#include <doctest/doctest.h>

#include <steelyard/base/bin_lanes.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/moment_lanes.hpp>
#include <steelyard/base/monomial_lanes.hpp>

#include <boost/multiprecision/cpp_bin_float.hpp>

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <limits>
#include <span>
#include <vector>

namespace sy = steelyard::detail;
using exact = boost::multiprecision::cpp_bin_float_50;

namespace {

constexpr double lowest = std::numeric_limits<double>::lowest();

std::vector<sy::isa> widths() {
  std::vector<sy::isa> all;
  for (sy::isa const width : {sy::isa::plain, sy::isa::sse2, sy::isa::avx2, sy::isa::avx512})
    if (width <= sy::widest_isa()) all.push_back(width);
  return all;
}

bool keeps_subnormals() {
  double volatile tiny = std::numeric_limits<double>::min();
  double volatile half = 0.5;
  return tiny * half > 0.0;
}

// A sequence that fills (0, 1) evenly: fractions of multiples of the golden ratio.
struct even {
  double u = 0.0;
  double operator()() { return u = std::fmod(u + 0.6180339887498949, 1.0); }
};

// Log-weights below `top`: most near it, some far down, some that vanish, some impossible.
std::vector<double> some_logs(std::size_t n, double top) {
  even u;
  std::vector<double> logs(n);
  for (std::size_t k = 0; k < n; ++k) {
    double const x = u();
    logs[k] = top - (k % 7 == 3 ? 800.0 * x : 20.0 * x * x);
    if (k % 11 == 5) logs[k] = lowest;
    if (k % 97 == 13) logs[k] = top - 1e5 * x;
  }
  return logs;
}

bool same_bits(double a, double b) { return std::bit_cast<std::uint64_t>(a) == std::bit_cast<std::uint64_t>(b); }

bool same_bits(std::span<double const> a, std::span<double const> b) {
  for (std::size_t k = 0; k < a.size(); ++k)
    if (!same_bits(a[k], b[k])) return false;
  return a.size() == b.size();
}

double ulps(double got, exact const& want) {
  int exponent = 0;
  static_cast<void>(frexp(want, &exponent));
  if (exponent < -1021) exponent = -1021;
  return std::abs(static_cast<double>((exact(got) - want) / ldexp(exact(1), exponent - 53)));
}

}  // namespace

TEST_CASE("weights and their sums have the same bits at every width, length and alignment") {
  std::size_t const sizes[] = {0, 1, 2, 7, 8, 9, 15, 16, 17, 23, 24, 31, 100, 1000, 1023, 1024, 1025, 1032, 2047, 5000};
  for (double const top : {0.0, 3.7, -1e5, 1e5})
    for (std::size_t const size : sizes)
      for (std::size_t const shift : {0u, 1u, 3u}) {
        std::vector<double> const logs = some_logs(size + shift, top);
        std::span<double const> const in(logs.data() + shift, size);
        std::vector<double> plain(size);
        auto const want = sy::weights_from_logs(in, top, plain, sy::isa::plain);
        for (sy::isa const width : widths()) {
          std::vector<double> out(size + shift + 1, -1.0);
          auto const got = sy::weights_from_logs(in, top, std::span<double>(out.data() + shift, size), width);
          bool const same = same_bits(std::span<double const>(out.data() + shift, size), plain) &&
                            same_bits(got.sum, want.sum) && same_bits(got.sum_squares, want.sum_squares) &&
                            same_bits(got.sum_logs, want.sum_logs) && out.back() == -1.0;
          CHECK_MESSAGE(same, "width ", static_cast<int>(width), ", size ", size, ", shift ", shift, ", top ", top);
        }
      }
}

TEST_CASE("weights may replace their logarithms in place") {
  std::vector<double> logs = some_logs(2000, 1.0);
  std::vector<double> apart(2000);
  auto const want = sy::weights_from_logs(logs, 1.0, apart);
  auto const got = sy::weights_from_logs(logs, 1.0, logs);
  CHECK(same_bits(logs, apart));
  CHECK(same_bits(got.sum, want.sum));
}

TEST_CASE("each weight is portable_exp of its distance from the maximum, and 0 where impossible") {
  for (double const top : {0.0, 3.7, -1e5, 1e300, -1e300}) {
    std::vector<double> const logs = some_logs(3000, top);
    std::vector<double> weights(3000);
    for (sy::isa const width : widths()) {
      sy::weights_from_logs(logs, top, weights, width);
      bool same = true;
      for (std::size_t k = 0; k < logs.size(); ++k)
        same = same && same_bits(weights[k], logs[k] == lowest ? 0.0 : sy::portable_exp(sy::minus(logs[k], top)));
      CHECK(same);
    }
  }
}

TEST_CASE("weights are within 1.1 ulp of Boost.Multiprecision, from 0 down to where they vanish") {
  even u;
  std::vector<double> logs(4000);
  for (std::size_t k = 0; k < logs.size(); ++k) {
    double const x = u();
    logs[k] = k % 2 == 0 ? -745.1 * x : -4.0 * x;
  }
  std::vector<double> weights(logs.size());
  for (sy::isa const width : widths()) {
    sy::weights_from_logs(logs, 0.0, weights, width);
    double worst = 0.0;
    double at = 0.0;
    for (std::size_t k = 0; k < logs.size(); ++k) {
      if (logs[k] < -708.3 && !keeps_subnormals()) continue;
      double const error = ulps(weights[k], exp(exact(logs[k])));
      if (error > worst) worst = error, at = logs[k];
    }
    MESSAGE("width ", static_cast<int>(width), ": worst ", worst, " ulp at ", at);
    CHECK(worst < 1.1);
  }
}

TEST_CASE("the weights of a library exponential are close by") {
  std::vector<double> const logs = some_logs(5000, 2.0);
  std::vector<double> weights(5000);
  auto const sums = sy::weights_from_logs(logs, 2.0, weights);
  long double sum = 0.0L;
  long double squares = 0.0L;
  long double products = 0.0L;
  for (std::size_t k = 0; k < logs.size(); ++k) {
    double const d = logs[k] == lowest ? -1e6 : logs[k] - 2.0;
    double const w = std::exp(d);
    CHECK(std::abs(weights[k] - w) <= 3e-16 * w + 1e-320);
    sum += w;
    squares += static_cast<long double>(w) * w;
    products += static_cast<long double>(w) * d;
  }
  CHECK(sums.sum == doctest::Approx(static_cast<double>(sum)).epsilon(1e-14));
  CHECK(sums.sum_squares == doctest::Approx(static_cast<double>(squares)).epsilon(1e-14));
  CHECK(sums.sum_logs == doctest::Approx(static_cast<double>(products)).epsilon(1e-14));
}

TEST_CASE("a sample without any likelihood has weights 0, not 1") {
  for (sy::isa const width : widths()) {
    std::vector<double> const logs(20, lowest);
    std::vector<double> weights(20, -1.0);
    auto const sums = sy::weights_from_logs(logs, sy::block_maximum(logs, width), weights, width);
    CHECK(sums.sum == 0.0);
    CHECK(sums.sum_squares == 0.0);
    CHECK(sums.sum_logs == 0.0);
    for (double const w : weights) CHECK(w == 0.0);
  }
}

TEST_CASE("a constant added to every log-weight changes no bit where the shift is exact") {
  std::vector<double> logs(1500);
  std::vector<double> shifted(1500);
  even u;
  for (std::size_t k = 0; k < logs.size(); ++k) {
    logs[k] = -std::round(u() * 1e6) * 0x1p-16;
    shifted[k] = logs[k] + 65536.0;
  }
  std::vector<double> a(1500);
  std::vector<double> b(1500);
  auto const x = sy::weights_from_logs(logs, 0.0, a);
  auto const y = sy::weights_from_logs(shifted, 65536.0, b);
  CHECK(same_bits(a, b));
  CHECK(same_bits(x.sum, y.sum));
}

TEST_CASE("blocks of 1024 summed pairwise give the sums of the whole") {
  std::vector<double> const logs = some_logs(5 * 1024 + 77, 0.0);
  std::vector<double> weights(logs.size());
  auto const whole = sy::weights_from_logs(logs, 0.0, weights);
  sy::pairwise_sum<sy::weight_sums> blocks;
  for (std::size_t first = 0; first < logs.size(); first += 1024) {
    std::size_t const size = std::min<std::size_t>(1024, logs.size() - first);
    auto const in = std::span(logs).subspan(first, size);
    blocks.add(sy::weights_from_logs(in, 0.0, std::span(weights).subspan(first, size)));
  }
  CHECK(same_bits(blocks.total().sum, whole.sum));
  CHECK(same_bits(blocks.total().sum_squares, whole.sum_squares));
  CHECK(same_bits(blocks.total().sum_logs, whole.sum_logs));
}

TEST_CASE("the largest of a block at every width, place and length") {
  for (sy::isa const width : widths()) {
    CHECK(sy::block_maximum({}, width) == lowest);
    for (std::size_t const size : {1u, 7u, 8u, 9u, 16u, 33u, 1024u, 1027u}) {
      std::vector<double> values = some_logs(size + 1, -3.0);
      std::span<double> const block(values.data() + 1, size);  // not aligned
      for (std::size_t k = 0; k < size; k += 1 + size / 40) {
        double const kept = block[k];
        block[k] = 5.5;
        CHECK(sy::block_maximum(block, width) == 5.5);
        block[k] = kept;
      }
      double want = lowest;
      for (double const v : block) want = std::max(want, v);
      CHECK(same_bits(sy::block_maximum(block, width), want));
    }
    std::vector<double> zeros = {-0.0, 0.0, -1.0, -0.0, 0.0, -0.0, -0.0, -0.0, -0.0};
    CHECK(same_bits(sy::block_maximum(zeros, width), 0.0));
    zeros[1] = zeros[4] = -0.0;
    CHECK(same_bits(sy::block_maximum(zeros, width), 0.0));
  }
}

namespace {

template <sy::block_sums Which, std::size_t N>
void same_sums_at_every_width(double centre, double idle_value, double idle_weight) {
  for (std::size_t const size : {0u, 1u, 7u, 8u, 9u, 16u, 100u, 1023u, 1024u})
    for (std::size_t const shift : {0u, 1u, 3u}) {
      even u;
      std::vector<double> values(size + shift), weights(size + shift);
      for (double& each : values) each = u() < 0.3 ? 0.0 : 1e3 * (u() - 0.5);
      for (double& each : weights) each = u() < 0.1 ? 0.0 : u();
      auto const f = std::span<double const>(values).subspan(shift), w = std::span<double const>(weights).subspan(shift);
      double plain[N];
      sy::sum_block<Which>(f, w, centre, idle_value, idle_weight, plain, sy::isa::plain);
      for (sy::isa const width : widths()) {
        double sums[N];
        sy::sum_block<Which>(f, w, centre, idle_value, idle_weight, sums, width);
        CHECK_MESSAGE(same_bits(sums, plain), "kernel ", static_cast<int>(Which), ", width ", static_cast<int>(width), ", size ",
                      size, ", shift ", shift);
      }
    }
}

}  // namespace

TEST_CASE("sums for error bars have the same bits at every width, length and alignment") {
  same_sums_at_every_width<sy::block_sums::first, 2>(12.5, 12.5, 0.0);
  same_sums_at_every_width<sy::block_sums::powers, 8>(-3.25, -3.25, 0.0);
  same_sums_at_every_width<sy::block_sums::parted, 6>(0.0, 0.0, 0.0);
  same_sums_at_every_width<sy::block_sums::spread, 4>(0.4, 0.0, 0.4);
}

TEST_CASE("sums for error bars are the sums they are named after") {
  std::vector<double> const f = {3.0, 0.0, -2.0, 5.0, 0.0, 1.0, 4.0, -1.0, 2.0, 7.0}, w = {1.0, 2.0, 4.0, 0.0, 8.0, 1.0, 2.0, 1.0, 4.0, 1.0};
  for (sy::isa const width : widths()) {
    double first[2], powers[8], parted[6], spread[4];
    sy::sum_block<sy::block_sums::first>(f, w, 1.0, 1.0, 0.0, first, width);
    sy::sum_block<sy::block_sums::powers>(f, w, 1.0, 1.0, 0.0, powers, width);
    sy::sum_block<sy::block_sums::parted>(f, w, 0.0, 0.0, 0.0, parted, width);
    sy::sum_block<sy::block_sums::spread>(f, w, 2.0, 0.0, 2.0, spread, width);
    double first_want[2] = {}, powers_want[8] = {}, parted_want[6] = {}, spread_want[4] = {};
    for (std::size_t i = 0; i < f.size(); ++i) {
      double const d = f[i] - 1.0, e = w[i] - 2.0, w2 = w[i] * w[i];
      first_want[0] += w[i];
      first_want[1] += w[i] * d;
      for (std::size_t k = 0; k < 3; ++k) powers_want[k] += w2 * std::pow(d, static_cast<double>(k));
      for (std::size_t k = 0; k < 5; ++k) powers_want[3 + k] += w2 * w2 * std::pow(d, static_cast<double>(k));
      double const own[3] = {w[i], w2, w2 * w2};
      for (std::size_t k = 0; k < 3; ++k) parted_want[k + (f[i] == 0.0 ? 3 : 0)] += own[k];
      for (std::size_t k = 0; k < 4; ++k) spread_want[k] += std::pow(e, static_cast<double>(k + 1));
    }
    CHECK(same_bits(first, first_want));  // whole numbers: exact in any order
    CHECK(same_bits(powers, powers_want));
    CHECK(same_bits(parted, parted_want));
    CHECK(same_bits(spread, spread_want));
  }
}

TEST_CASE("sums of powers and products have the same bits at every width, and are what they are named after") {
  std::size_t const groups = 21, n = groups * sy::virtual_lanes;
  even u;
  std::vector<double> x(n), y(n), w(n);
  for (std::size_t i = 0; i < n; ++i) x[i] = 2.0 * u() - 1.0, y[i] = 2.0 * u() - 1.0, w[i] = u();
  double plain[15 * 8] = {}, of_one[5 * 8] = {};
  sy::sum_monomials<2, 4>(x.data(), y.data(), w.data(), groups, plain, sy::isa::plain);
  sy::sum_monomials<1, 4>(x.data(), x.data(), w.data(), groups, of_one, sy::isa::plain);
  for (sy::isa const width : widths()) {
    double two[15 * 8] = {}, one[5 * 8] = {};
    sy::sum_monomials<2, 4>(x.data(), y.data(), w.data(), groups, two, width);
    sy::sum_monomials<1, 4>(x.data(), x.data(), w.data(), groups, one, width);
    CHECK(same_bits(two, plain));
    CHECK(same_bits(one, of_one));
  }
  for (std::size_t a = 0; a <= 4; ++a)
    for (std::size_t b = 0; a + b <= 4; ++b) {
      double want = 0.0;
      for (std::size_t i = 0; i < n; ++i) want += w[i] * std::pow(x[i], static_cast<double>(a)) * std::pow(y[i], static_cast<double>(b));
      CHECK(std::abs(sy::lane_total(plain + 8 * ((a + b) * (a + b + 1) / 2 + b)) - want) < 1e-12);
      if (b == 0) CHECK(std::abs(sy::lane_total(of_one + 8 * a) - want) < 1e-12);
    }
}

TEST_CASE("the total of values has the same bits at every width, and is right") {
  for (std::size_t const size : {0u, 1u, 7u, 8u, 9u, 1023u, 1024u, 1025u, 4096u, 5001u}) {
    even u;
    std::vector<double> values(size + 1);
    long double want = 0.0L;
    for (double& each : values) each = 2.0 * u() - 0.7;
    auto const some = std::span<double const>(values).subspan(1);
    for (double const each : some) want += each;
    double const plain = sy::total_of(some, sy::isa::plain);
    for (sy::isa const width : widths()) CHECK(same_bits(sy::total_of(some, width), plain));
    CHECK(std::abs(plain - static_cast<double>(want)) <= 1e-13 * static_cast<double>(size));
  }
}

TEST_CASE("one value that is not finite is noticed at any place, at every width, whatever the compiler was told") {
  std::uint64_t const odd[] = {0x7ff0000000000000u, 0xfff0000000000000u, 0x7ff8000000000000u, 0xfff0000000000001u};
  for (sy::isa const width : widths())
    for (std::size_t const size : {1u, 7u, 8u, 9u, 30u}) {
      std::vector<double> values(size, std::numeric_limits<double>::max());
      values.front() = lowest;
      CHECK(sy::all_finite(values, width));
      for (std::size_t k = 0; k < size; ++k)
        for (std::uint64_t const bits : odd) {
          double const kept = values[k];
          std::memcpy(&values[k], &bits, sizeof bits);
          CHECK_FALSE(sy::all_finite(values, width));
          values[k] = kept;
        }
    }
  CHECK(sy::all_finite({}));
}

TEST_CASE("places among even bins: the same at every width, right where they are given, and given nearly everywhere") {
  struct frame {
    double lower, upper;
    std::size_t bins;
  };
  for (frame const& of : {frame{0.0, 1.0, 100}, frame{-3.0, 5.0, 7}, frame{1e6, 1e6 + 1.0, 50}, frame{-1e-9, 1e-9, 1}}) {
    double const span = of.upper - of.lower, n = static_cast<double>(of.bins), per_width = n / span;
    double const slack = 0x1p-50 * (std::max(std::abs(of.lower), std::abs(of.upper)) * per_width + n);
    sy::even_bins const bins{of.lower, per_width, n, slack};
    std::vector<double> values;
    for (std::size_t b = 0; b <= of.bins; ++b) {
      double x = of.lower + span * (static_cast<double>(b) / n);
      for (int k = 0; k < 4; ++k) x = std::nextafter(x, lowest);
      for (int k = 0; k < 9; ++k, x = std::nextafter(x, of.upper + span)) values.push_back(x);
    }
    even u;
    std::size_t const plain_ones = 3000;
    for (std::size_t k = 0; k < plain_ones; ++k) values.push_back(of.lower + span * (1.4 * u() - 0.2));
    for (double const x : {lowest, -lowest, -0.0, 0.0}) values.push_back(x);
    std::size_t const finite = values.size();
    for (std::uint64_t const bits : {0x7ff0000000000000u, 0xfff0000000000000u, 0x7ff8000000000000u, 0xfff0000000000001u}) {
      double x;
      std::memcpy(&x, &bits, sizeof bits);
      values.push_back(x);
    }
    std::vector<std::uint64_t> plain(values.size());
    CHECK(sy::place_all(values, bins, plain.data(), sy::isa::plain));
    for (sy::isa const width : widths())
      for (std::size_t const shift : {0u, 1u, 5u}) {
        std::vector<std::uint64_t> places(values.size() + 1, 77u);
        auto const some = std::span<double const>(values).subspan(shift);
        CHECK(sy::place_all(some, bins, places.data(), width));
        CHECK(std::equal(plain.begin() + static_cast<std::ptrdiff_t>(shift), plain.end(), places.begin()));
        CHECK(places[some.size()] == 77u);
      }
    std::size_t wrong = 0, left = 0;
    for (std::size_t k = 0; k < values.size(); ++k) {
      if (plain[k] == sy::unplaced) {
        left += k < finite ? 1 : 0;
        continue;
      }
      wrong += k < finite ? 0 : 1;
      auto const edge = [&](std::size_t b) { return exact(of.lower) + (exact(of.upper) - exact(of.lower)) * b / of.bins; };
      std::uint64_t const b = plain[k];
      bool const right = b == of.bins       ? exact(values[k]) < edge(0)
                         : b == of.bins + 1 ? exact(values[k]) > edge(of.bins)
                                            : exact(values[k]) >= edge(b) && exact(values[k]) < edge(b + 1);
      wrong += right ? 0 : 1;
    }
    CAPTURE(of.lower);
    CHECK(wrong == 0);
    CHECK(left <= 9 * (of.bins + 1) + 2);  // those beside the edges, and zero
    CHECK_FALSE(sy::place_all(std::vector<double>{of.lower + 0.3 * span / n}, bins, plain.data()));
  }
}

TEST_CASE("the vector kernels are switched off by STEELYARD_PLAIN_KERNELS and on by the processor") {
#if defined(STEELYARD_PLAIN_KERNELS) || !defined(__x86_64__)
  CHECK(sy::widest_isa() == sy::isa::plain);
#else
  CHECK(sy::widest_isa() >= sy::isa::sse2);
#endif
}
