// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>

#include <boost/math/distributions/arcsine.hpp>
#include <boost/math/distributions/beta.hpp>
#include <boost/math/distributions/cauchy.hpp>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/exponential.hpp>
#include <boost/math/distributions/extreme_value.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/gamma.hpp>
#include <boost/math/distributions/hyperexponential.hpp>
#include <boost/math/distributions/inverse_chi_squared.hpp>
#include <boost/math/distributions/inverse_gamma.hpp>
#include <boost/math/distributions/inverse_gaussian.hpp>
#include <boost/math/distributions/laplace.hpp>
#include <boost/math/distributions/logistic.hpp>
#include <boost/math/distributions/lognormal.hpp>
#include <boost/math/distributions/non_central_beta.hpp>
#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <boost/math/distributions/non_central_f.hpp>
#include <boost/math/distributions/non_central_t.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/pareto.hpp>
#include <boost/math/distributions/rayleigh.hpp>
#include <boost/math/distributions/skew_normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/distributions/triangular.hpp>
#include <boost/math/distributions/uniform.hpp>
#include <boost/math/distributions/weibull.hpp>
#if __has_include(<boost/math/distributions/kolmogorov_smirnov.hpp>)
#include <boost/math/distributions/kolmogorov_smirnov.hpp>
#endif

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <string>
#include <type_traits>
#include <vector>

namespace sy = steelyard;
namespace bm = boost::math;

namespace {

// Probability integral transform: cdf of the draws on 20 even cells; 99.99 % point of chi-square at 19 degrees is
// 50.795. Beside it each draw must be the quantile of its own word: one word each, the cdf back at the word's
// uniform to `tolerance` (Boost's own accuracy for the distribution).
template <class Distribution>
void draws_from(char const* name, Distribution const& distribution, int n = 2000, double tolerance = 1e-10) {
  INFO(std::string(name));
  std::vector<int> cells(20);
  sy::draws d(1);
  sy::draws twin(1);
  double worst = 0.0;
  double last_x = 0.0;
  double last_u = 0.0;
  bool rises = true;
  for (int k = 0; k < n; ++k) {
    auto const x = d.from(distribution);
    double const u = twin.uniform();
    double const v = static_cast<double>(cdf(distribution, x));
    worst = std::max(worst, std::abs(u - v));
    std::size_t const cell = static_cast<std::size_t>(20.0 * v);
    ++cells[cell < 20 ? cell : 19];
    if (k > 0 && u > last_u) rises = rises && x >= last_x;
    if (k > 0 && u < last_u) rises = rises && x <= last_x;
    last_x = static_cast<double>(x);
    last_u = u;
  }
  double chi_square = 0.0;
  for (int const seen : cells) chi_square += (seen - n / 20.0) * (seen - n / 20.0) / (n / 20.0);
  CHECK(chi_square < 50.795);
  CHECK(worst < tolerance);
  CHECK(rises);
  CHECK(d.words_used() == static_cast<std::uint64_t>(n));
}

}  // namespace

TEST_CASE("from: Boost.Math's continuous distributions, by inversion of one word") {
  draws_from("arcsine", bm::arcsine_distribution<double>(-1.0, 2.0));
  draws_from("beta", bm::beta_distribution<double>(2.0, 3.5));
  draws_from("beta with both ends infinite", bm::beta_distribution<double>(0.4, 0.3));
  draws_from("cauchy", bm::cauchy_distribution<double>(1.0, 2.0));
  draws_from("chi squared", bm::chi_squared_distribution<double>(3.0));
  draws_from("exponential", bm::exponential_distribution<double>(2.0));
  draws_from("extreme value", bm::extreme_value_distribution<double>(1.0, 2.0));
  draws_from("fisher f", bm::fisher_f_distribution<double>(4.0, 7.0));
  draws_from("gamma", bm::gamma_distribution<double>(0.7, 2.0));
  double const probabilities[] = {0.2, 0.8};
  double const rates[] = {0.5, 3.0};
  draws_from("hyperexponential", bm::hyperexponential_distribution<double>(probabilities, rates));
  draws_from("inverse chi squared", bm::inverse_chi_squared_distribution<double>(5.0, 2.0));
  draws_from("inverse gamma", bm::inverse_gamma_distribution<double>(3.0, 2.0));
  draws_from("inverse gaussian", bm::inverse_gaussian_distribution<double>(1.0, 3.0));
  draws_from("laplace", bm::laplace_distribution<double>(-1.0, 2.0));
  draws_from("logistic", bm::logistic_distribution<double>(0.5, 2.0));
  draws_from("lognormal", bm::lognormal_distribution<double>(-2.325, 0.434));
  draws_from("normal", bm::normal_distribution<double>(850.0, 100.0));
  draws_from("pareto", bm::pareto_distribution<double>(1.0, 3.0));
  draws_from("rayleigh", bm::rayleigh_distribution<double>(2.0));
  draws_from("student's t", bm::students_t_distribution<double>(2.5));
  draws_from("triangular", bm::triangular_distribution<double>(-1.0, 0.0, 3.0));
  draws_from("uniform", bm::uniform_distribution<double>(2.0, 5.0));
  draws_from("weibull", bm::weibull_distribution<double>(1.5, 2.0));
}

TEST_CASE("from: distributions whose quantiles Boost.Math finds by search") {
  draws_from("non-central beta", bm::non_central_beta_distribution<double>(2.0, 3.0, 1.5), 2000, 1e-6);
  draws_from("non-central chi squared", bm::non_central_chi_squared_distribution<double>(3.0, 2.0), 2000, 1e-6);
  draws_from("non-central f", bm::non_central_f_distribution<double>(4.0, 7.0, 1.5), 2000, 1e-6);
  draws_from("non-central t", bm::non_central_t_distribution<double>(5.0, 1.0), 2000, 1e-6);
  draws_from("skew normal", bm::skew_normal_distribution<double>(0.0, 1.0, 2.0), 2000, 1e-6);
#if __has_include(<boost/math/distributions/kolmogorov_smirnov.hpp>)
  draws_from("kolmogorov smirnov", bm::kolmogorov_smirnov_distribution<double>(50.0), 2000, 1e-6);
#endif
}

TEST_CASE("from: the normal of Boost.Math is the normal of draws") {
  sy::draws a(1);
  sy::draws b(1);
  for (int k = 0; k < 500; ++k)
    CHECK(a.from(bm::normal_distribution<double>(2.0, 0.5)) == doctest::Approx(b.normal(2.0, 0.5)).epsilon(1e-14));
}

TEST_CASE("from: both far tails keep all 64 bits") {
  std::uint64_t const words[] = {0, ~std::uint64_t{0}, 5, 6};
  sy::draws d(1);
  sy::detail::draws_access::seat(d, 1, 1, sy::purpose::run, 0, words);
  bm::exponential_distribution<double> const exponential(1.0);
  CHECK(d.from(exponential) == doctest::Approx(0x1p-65).epsilon(1e-14));
  CHECK(d.from(exponential) == doctest::Approx(65 * std::log(2.0)).epsilon(1e-14));
}

TEST_CASE("from: float distributions stay float") {
  sy::draws d(1);
  auto const x = d.from(bm::gamma_distribution<float>(2.0f, 1.0f));
  static_assert(std::is_same_v<decltype(x), float const>);
  CHECK(x > 0.0f);
}

namespace mine {

// A distribution of the user's own: quantile and complement beside it suffice.
struct wedge {};
struct wedge_complement {
  double q;
};
wedge_complement complement(wedge const&, double q) { return {q}; }
double quantile(wedge const&, double p) { return std::sqrt(p); }
double quantile(wedge_complement const& c) { return std::sqrt(1.0 - c.q); }

}  // namespace mine

TEST_CASE("from: a user's own distribution") {
  sy::draws d(1);
  sy::draws twin(1);
  for (int k = 0; k < 100; ++k)
    CHECK(d.from(mine::wedge{}) == doctest::Approx(std::sqrt(twin.uniform())).epsilon(1e-12));
}
