// SPDX-License-Identifier: BSL-1.0
// legs: plain
#include <doctest/doctest.h>

#include <steelyard/draw/draws.hpp>

#include <boost/math/distributions/bernoulli.hpp>
#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/geometric.hpp>
#include <boost/math/distributions/hypergeometric.hpp>
#include <boost/math/distributions/negative_binomial.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/poisson.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <map>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

namespace sy = steelyard;
namespace bm = boost::math;
using namespace boost::math::policies;

static_assert(sy::detail::is_known_discrete<bm::poisson_distribution<double>>);
static_assert(sy::detail::is_known_discrete<bm::hypergeometric_distribution<float>>);
static_assert(!sy::detail::is_known_discrete<bm::normal_distribution<double>>);

namespace {

// Boost.Math's ways to round a discrete quantile, each of which alone gives other draws when taken at its word.
using outwards = policy<discrete_quantile<integer_round_outwards>>;  // the default
using inwards = policy<discrete_quantile<integer_round_inwards>>;
using up = policy<discrete_quantile<integer_round_up>>;
using down = policy<discrete_quantile<integer_round_down>>;
using nearest = policy<discrete_quantile<integer_round_nearest>>;
using uncut = policy<discrete_quantile<real>>;

// The six distributions under one policy. Boost.Math's hypergeometric quantile does not compile under `real`.
template <class Policy, class Visitor>
void each_distribution(Visitor const& visit) {
  visit("bernoulli", bm::bernoulli_distribution<double, Policy>(0.3));
  visit("binomial", bm::binomial_distribution<double, Policy>(12.0, 0.35));
  visit("binomial, many", bm::binomial_distribution<double, Policy>(4000.0, 0.02));
  visit("geometric", bm::geometric_distribution<double, Policy>(0.2));
  if constexpr (!std::is_same_v<Policy, uncut>) {
    visit("hypergeometric", bm::hypergeometric_distribution<double, Policy>(20, 15, 60));
    visit("hypergeometric from above 0", bm::hypergeometric_distribution<double, Policy>(20, 15, 30));
  }
  visit("negative binomial", bm::negative_binomial_distribution<double, Policy>(3.5, 0.4));
  visit("poisson", bm::poisson_distribution<double, Policy>(3.8));
  visit("poisson, rare", bm::poisson_distribution<double, Policy>(0.01));
  visit("poisson, many", bm::poisson_distribution<double, Policy>(250.0));
}

template <class Distribution>
double draw_at(Distribution const& distribution, std::uint64_t word) {
  sy::draws d(1);
  std::array<std::uint64_t, 4> const words = {word, 0, 0, 0};
  sy::detail::draws_access::seat(d, 1, 1, sy::purpose::run, 0, words);
  return d.from(distribution);
}

// Whether k is the smallest whole number with cdf(k) >= u, u taken from the nearer tail of the word.
template <class Distribution>
bool is_smallest(Distribution const& distribution, std::uint64_t word, double k) {
  auto const t = sy::detail::tail_from_word(word);
  auto const reached = [&](double at) {
    return t.lower ? cdf(distribution, at) >= t.probability : cdf(complement(distribution, at)) <= t.probability;
  };
  double const lowest = static_cast<double>(support(distribution).first);
  return k == std::floor(k) && reached(k) && (k == lowest || !reached(k - 1.0));
}

template <class Policy>
void smallest_under(char const* policy_name) {
  each_distribution<Policy>([&](char const* name, auto const& distribution) {
    std::vector<std::uint64_t> words = {0, 1, (std::uint64_t{1} << 63) - 1, std::uint64_t{1} << 63, ~std::uint64_t{0}};
    for (std::uint64_t k = 1; k <= 60; ++k) words.push_back(k * 0x9E3779B97F4A7C15u);
    auto const [first, last] = support(distribution);
    for (double k = std::max(double(first), std::floor(mean(distribution)) - 4.0), n = 0;
         n < 8 && k < static_cast<double>(last); k += 1.0, n += 1.0) {  // words close to the steps
      double const below = cdf(distribution, k);
      double const above = cdf(complement(distribution, k));
      if (below < 0.5) {
        auto const word = static_cast<std::uint64_t>(below * 0x1p64);
        for (std::uint64_t const shift : {0u, 1u, 3000u, 1000000u}) {
          words.push_back(word + shift);
          if (word >= shift) words.push_back(word - shift);
        }
      } else if (above < 0.5 && above > 1e-15) {
        auto const word = ~static_cast<std::uint64_t>(above * 0x1p64);
        for (std::uint64_t const shift : {0u, 1u, 3000u, 1000000u}) {
          words.push_back(word + shift);
          words.push_back(word - shift);
        }
      }
    }
    int wrong = 0;
    for (std::uint64_t const word : words) wrong += !is_smallest(distribution, word, draw_at(distribution, word));
    CHECK_MESSAGE(wrong == 0, std::string(name), " under ", std::string(policy_name), ", ", words.size(), " words");
  });
}

}  // namespace

TEST_CASE("from: the smallest k with cdf(k) >= u, whatever the rounding policy") {
  smallest_under<outwards>("outwards");
  smallest_under<inwards>("inwards");
  smallest_under<up>("up");
  smallest_under<down>("down");
  smallest_under<nearest>("nearest");
  smallest_under<uncut>("real");
}

TEST_CASE("from: the policy changes no draw") {
  std::map<std::string, std::vector<double>> first;
  int compared = 0;
  auto const compare = [&](auto policy) {
    each_distribution<decltype(policy)>([&](char const* name, auto const& distribution) {
      std::vector<double> drawn;
      sy::draws d(1);
      for (int k = 0; k < 100; ++k) drawn.push_back(d.from(distribution));
      if (auto const [known, is_new] = first.try_emplace(name, drawn); !is_new) {
        CHECK(known->second == drawn);
        ++compared;
      }
    });
  };
  compare(outwards());
  compare(inwards());
  compare(up());
  compare(down());
  compare(nearest());
  compare(uncut());
  CHECK(compared == 10 * 5 - 2);
}

TEST_CASE("from: discrete draws are distributed as they should be") {
  // chi-square over the values that expect at least five draws, tails pooled; limit: its 99.99 % point
  each_distribution<outwards>([](char const* name, auto const& distribution) {
    int const n = 5000;
    std::vector<double> seen;
    sy::draws d(1);
    for (int k = 0; k < n; ++k) {
      auto const at = static_cast<std::size_t>(d.from(distribution));
      if (at >= seen.size()) seen.resize(at + 1);
      seen[at] += 1.0;
    }
    CHECK(d.words_used() == static_cast<std::uint64_t>(n));
    double statistic = 0.0;
    double degrees = -1.0;
    double pooled_seen = 0.0;
    double pooled_expected = 0.0;
    double left = n;
    auto const close = [&](double got, double expected) {
      statistic += (got - expected) * (got - expected) / expected;
      degrees += 1.0;
    };
    for (std::size_t k = 0; k < seen.size(); ++k) {
      double const value = static_cast<double>(k);
      auto const [first, last] = support(distribution);
      bool const inside = value >= static_cast<double>(first) && value <= static_cast<double>(last);
      double const expected = inside ? n * pdf(distribution, value) : 0.0;
      if (expected == 0.0) CHECK(seen[k] == 0.0);
      pooled_seen += seen[k];
      pooled_expected += expected;
      left -= expected;
      if (pooled_expected < 5.0 || left < 5.0) continue;
      close(pooled_seen, pooled_expected);
      pooled_seen = pooled_expected = 0.0;
    }
    close(pooled_seen, pooled_expected + left);
    REQUIRE(degrees >= 1.0);
    double const limit = quantile(complement(bm::chi_squared_distribution<double>(degrees), 1e-4));
    CHECK_MESSAGE(statistic < limit, std::string(name), ": ", statistic, " on ", degrees, " degrees");
  });
}

TEST_CASE("from: discrete draws rise with the word") {
  each_distribution<outwards>([](char const* name, auto const& distribution) {
    double last = -1.0;
    bool rises = true;
    for (std::uint64_t k = 0; k < 256; ++k) {
      double const value = draw_at(distribution, k << 56);
      rises = rises && value >= last;
      last = value;
    }
    CHECK_MESSAGE(rises, std::string(name));
  });
}

TEST_CASE("from: known steps") {
  // fair coin: u of the lowest half gives 0, since cdf(0) = 1/2
  bm::bernoulli_distribution<double> const coin(0.5);
  CHECK(draw_at(coin, 0) == 0.0);
  CHECK(draw_at(coin, (std::uint64_t{1} << 63) - 1) == 0.0);
  CHECK(draw_at(coin, ~std::uint64_t{0}) == 1.0);
  // geometric, p = 1/2: P(K > k) = 2^-(k + 1), so words near the top have exact answers
  bm::geometric_distribution<double> const geometric(0.5);
  CHECK(draw_at(geometric, ~std::uint64_t{0}) == 64.0);  // upper tail 2^-65
  CHECK(draw_at(geometric, ~std::uint64_t{1}) == 63.0);  // 1.5 * 2^-64
}

namespace mine {

// Thirds on 10, 20 and 30: not one of Boost's, so it is named discrete by hand; its quantile is useless on purpose.
struct steps {};
struct steps_complement {
  double x;
};
steps_complement complement(steps const&, double x) { return {x}; }
double cdf(steps const&, double k) { return k < 10.0 ? 0.0 : k < 20.0 ? 1.0 / 3.0 : k < 30.0 ? 2.0 / 3.0 : 1.0; }
double cdf(steps_complement const& c) { return 1.0 - cdf(steps{}, c.x); }
double quantile(steps const&, double) { return -1e9; }
double quantile(steps_complement const&) { return 1e300; }
std::pair<double, double> support(steps const&) { return {0.0, 1e18}; }

}  // namespace mine

TEST_CASE("from(dist, discrete): a user's own, found by search even from a bad quantile") {
  std::array<int, 3> seen{};
  sy::draws d(1);
  for (int k = 0; k < 3000; ++k) {
    double const value = d.from(mine::steps{}, sy::discrete);
    REQUIRE((value == 10.0 || value == 20.0 || value == 30.0));
    ++seen[static_cast<std::size_t>(value / 10.0) - 1];
  }
  double chi_square = 0.0;
  for (int const n : seen) chi_square += (n - 1000.0) * (n - 1000.0) / 1000.0;
  CHECK(chi_square < 18.421);  // 99.99 % at 2 degrees: -2 ln(1e-4)
}
