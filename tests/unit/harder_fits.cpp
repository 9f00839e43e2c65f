// SPDX-License-Identifier: BSL-1.0
// Laws that moves are fitted by: ridges as thin as they are, noise kept out, several modes found.

#include <doctest/doctest.h>

#include <cmath>
#include <cstddef>
#include <functional>
#include <span>
#include <vector>

#include <steelyard/harder/fit_normal.hpp>
#include <steelyard/harder/mixture_fit.hpp>

namespace sy = steelyard;
using sy::detail::fit_normal;
using sy::detail::mixture_fit;
using sy::detail::normal_fit;
using sy::detail::weighted_points;

namespace {

using law = std::function<std::vector<double>(sy::draws&)>;

/// n points of a law, half of them in each part; weights of the first kind 1, of the second 3.
void fill(weighted_points (&parts)[2], law const& from, std::size_t n, std::uint64_t seed) {
  sy::draws draws(seed);
  for (std::size_t p = 0; p < n; ++p) {
    auto const x = from(draws);
    parts[p % 2].rows.insert(parts[p % 2].rows.end(), x.begin(), x.end());
    parts[p % 2].weights.push_back(p % 4 < 2 ? 1.0 : 3.0);
  }
}
normal_fit fitted(law const& from, std::size_t k, std::size_t n, std::uint64_t seed = 1) {
  weighted_points parts[2];
  fill(parts, from, n, seed);
  return fit_normal(parts, k);
}
mixture_fit mixed(law const& from, std::size_t k, std::size_t n) {
  weighted_points parts[2], points[2];
  fill(parts, from, n, 1);
  for (std::size_t h = 0; h < 2; ++h) points[h] = parts[h];
  return mixture_fit::of(fit_normal(parts, k), points);
}
/// Mean square, over 4000 fresh points, of what each would be if the fit were the law: 1.
double fresh_square(normal_fit const& fit, law const& from) {
  sy::draws draws(99);
  double sum = 0.0;
  for (int p = 0; p < 4000; ++p) {
    auto const x = from(draws);
    std::vector<double> e(fit.size());
    sum += fit.standardise(x, e);
  }
  return sum / 4000.0 / static_cast<double>(fit.size());
}

law independent(std::size_t k) {
  return [k](sy::draws& d) {
    std::vector<double> x(k);
    for (double& v : x) v = d.normal();
    return x;
  };
}

}  // namespace

TEST_CASE("a ridge stays as thin as it is, down to rounding, whatever else is fitted") {
  for (double const ratio : {1e-1, 1e-3, 1e-5, 1e-7, 1e-9, 1e-12}) {
    CAPTURE(ratio);
    law const two = [ratio](sy::draws& d) {
      double const along = d.normal();
      return std::vector<double>{0.3 + along, 1.0 - 2.0 * along + ratio * d.normal()};
    };
    normal_fit const fit = fitted(two, 2, 1500);
    CHECK(fresh_square(fit, two) == doctest::Approx(1.0).epsilon(0.1));
    CHECK(fit.log_root() == doctest::Approx(std::log(ratio)).epsilon(0.1));

    // Three words that add up to 1 but for the ratio, among nine that have nothing to do with them.
    law const three = [ratio](sy::draws& d) {
      std::vector<double> x(12);
      for (double& v : x) v = d.normal();
      x[7] = 1.0 - x[2] - x[5] + ratio * d.normal();
      return x;
    };
    normal_fit const among = fitted(three, 12, 1500);
    CHECK(fresh_square(among, three) == doctest::Approx(1.0).epsilon(0.1));
    CHECK(among.log_root() == doctest::Approx(std::log(ratio)).epsilon(0.1));
  }
}

TEST_CASE("words that are independent are fitted so") {
  for (std::size_t const k : {std::size_t{16}, std::size_t{64}}) {
    CAPTURE(k);
    normal_fit const fit = fitted(independent(k), k, 1000);
    // Unshrunk, the covariance of n points makes fresh squares n/(n - k - 2) times as large; these are worth n = 800.
    CHECK(fresh_square(fit, independent(k)) == doctest::Approx(1.0).epsilon(0.02));
  }
  // Too few points for a full matrix still leave a fit.
  normal_fit const few = fitted(independent(64), 64, 60);
  REQUIRE(few.size() == 64u);
  CHECK(fresh_square(few, independent(64)) == doctest::Approx(1.0).epsilon(0.2));
  CHECK(fitted(independent(2), 2, 6).size() == 0u);
}

TEST_CASE("correlations that all words share are kept") {
  law const shared = [](sy::draws& d) {
    std::vector<double> x(32);
    double const common = d.normal();
    for (double& v : x) v = d.normal() + 0.5 * common;
    return x;
  };
  // Along the common direction the deviation is 3 times that of the others.
  normal_fit const fit = fitted(shared, 32, 1500);
  std::vector<double> one(32, 1.0), zero(32, 0.0), e(32), origin(32);
  fit.standardise(zero, origin);
  fit.standardise(one, e);
  double along = 0.0;
  for (std::size_t i = 0; i < 32; ++i) along += (e[i] - origin[i]) * (e[i] - origin[i]);
  CHECK(along == doctest::Approx(32.0 / (1.0 + 0.25 * 32.0)).epsilon(0.2));
}

TEST_CASE("units of the words do not matter, and a word that never changes does no harm") {
  law const plain = [](sy::draws& d) {
    double const a = d.normal(), b = d.normal(), c = d.normal();
    return std::vector<double>{a, b + 0.5 * a, c - b};
  };
  law const scaled = [&plain](sy::draws& d) {
    auto x = plain(d);
    x[0] *= 0x1p-20;
    x[1] *= 0x1p10;
    x[2] *= 0x1p-3;
    return x;
  };
  normal_fit const one = fitted(plain, 3, 400), other = fitted(scaled, 3, 400);
  std::vector<double> const x{0.3, -0.7, 1.1}, y{0.3 * 0x1p-20, -0.7 * 0x1p10, 1.1 * 0x1p-3};
  std::vector<double> e(3), f(3);
  one.standardise(x, e);
  other.standardise(y, f);
  for (std::size_t i = 0; i < 3; ++i) CHECK(f[i] == doctest::Approx(e[i]).epsilon(1e-9));
  std::vector<double> back(3);
  one.place(e, back);
  for (std::size_t i = 0; i < 3; ++i) CHECK(back[i] == doctest::Approx(x[i]).epsilon(1e-12));

  normal_fit const still = fitted([](sy::draws& d) { return std::vector<double>{d.normal(), 0.25, d.normal()}; }, 3, 400);
  CHECK(still.deviation(0) == doctest::Approx(1.0).epsilon(0.2));
  CHECK(still.deviation(1) < 1e-12);
  CHECK(still.deviation(2) == doctest::Approx(1.0).epsilon(0.2));
}

TEST_CASE("modes are found, with their shares; one mode is left to the normal law") {
  law const two = [](sy::draws& d) {
    double const side = d.uniform() < 0.3 ? -1.0 : 1.0;
    return std::vector<double>{side + 1e-6 * d.normal()};
  };
  mixture_fit const modes = mixed(two, 1, 1200);
  REQUIRE(modes.modes() == 2u);
  // Densities at the modes: 0.3 and 0.7 over 1e-6 sqrt(2 pi); log_density leaves out half of log(2 pi).
  double const low = -1.0, high = 1.0;
  CHECK(modes.log_density(std::span(&low, 1)) == doctest::Approx(std::log(0.3e6)).epsilon(0.02));
  CHECK(modes.log_density(std::span(&high, 1)) == doctest::Approx(std::log(0.7e6)).epsilon(0.02));
  sy::draws draws(5);
  int below = 0, far = 0;
  for (int i = 0; i < 4000; ++i) {
    double x = 0.0;
    modes.draw(draws, std::span(&x, 1));
    far += std::abs(std::abs(x) - 1.0) < 1e-5 ? 0 : 1;
    below += x < 0.0 ? 1 : 0;
  }
  CHECK(far == 0);
  CHECK(below / 4000.0 == doctest::Approx(0.3).epsilon(0.15));

  // Four modes in the signs of two words, and a ridge in two others.
  law const four = [](sy::draws& d) {
    double const a = d.uniform() < 0.5 ? -1.0 : 1.0, b = d.uniform() < 0.5 ? -1.0 : 1.0, along = d.normal();
    return std::vector<double>{a + 0.05 * d.normal(), along, b + 0.05 * d.normal(), 0.01 * d.normal() - along};
  };
  CHECK(mixed(four, 4, 1500).modes() >= 4u);

  CHECK(mixed(independent(1), 1, 1200).modes() == 0u);
  CHECK(mixed(independent(4), 4, 1200).modes() == 0u);
  CHECK(mixed(independent(5), 5, 1200).modes() == 0u);  // too many words
}

TEST_CASE("a mixture is a density: its integral is 1, and draws follow it") {
  law const skew = [](sy::draws& d) {
    double const u = d.uniform();
    return std::vector<double>{u < 0.2 ? -2.0 + 0.2 * d.normal() : u < 0.6 ? 0.3 * d.normal() : 1.5 + 0.5 * d.normal()};
  };
  mixture_fit const mix = mixed(skew, 1, 1500);
  REQUIRE(mix.modes() >= 2u);
  double integral = 0.0, below = 0.0;
  for (int i = 0; i < 40000; ++i) {
    double const x = -10.0 + (i + 0.5) * 5e-4;
    double const mass = 5e-4 * std::exp(mix.log_density(std::span(&x, 1))) / std::sqrt(2.0 * 3.14159265358979324);
    integral += mass;
    below += x < 0.7 ? mass : 0.0;
  }
  CHECK(integral == doctest::Approx(1.0).epsilon(1e-6));
  sy::draws draws(7);
  int seen = 0;
  for (int i = 0; i < 10000; ++i) {
    double x = 0.0;
    mix.draw(draws, std::span(&x, 1));
    seen += x < 0.7 ? 1 : 0;
  }
  CHECK(std::abs(seen - 1e4 * below) <= 5.0 * std::sqrt(1e4 * below * (1.0 - below)));
}
