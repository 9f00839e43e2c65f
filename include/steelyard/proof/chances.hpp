// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

#include <boost/math/distributions/binomial.hpp>
#include <boost/math/special_functions/gamma.hpp>

#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>

namespace steelyard::inline v1::proof::detail {

namespace up = steelyard::v1::detail;

using quiet = boost::math::policies::policy<
    boost::math::policies::promote_double<false>,
    boost::math::policies::discrete_quantile<boost::math::policies::integer_round_outwards>>;

/// @throws bad_argument unless 0 < rate < 1.
inline double checked_rate(char const* where, double rate) {
  if (!(rate > 0.0 && rate < 1.0))
    throw bad_argument(std::string(where) + ": the false-alarm rate " + up::plain_number(rate) + " is outside (0, 1)");
  return rate;
}

/// P(chi-square with `degrees` degrees of freedom >= x).
inline double chi_square_upper(double x, double degrees) {
  return x > 0.0 ? boost::math::gamma_q(0.5 * degrees, 0.5 * x, quiet()) : 1.0;
}

/// Exact limits for k of n hits, each with probability p: below `first` or above
/// `second` has probability at most `rate`, half on either side.
inline std::pair<std::uint64_t, std::uint64_t> hit_limits(std::uint64_t n, double p, double rate) {
  boost::math::binomial_distribution<double, quiet> const hits(static_cast<double>(n), p);
  // The smallest k in [0, n] for which `holds(k)`; it holds at n and keeps holding once it does.
  auto const first_that = [n](auto holds) {
    std::uint64_t low = 0, high = n;
    while (low < high) {
      std::uint64_t const middle = low + (high - low) / 2;
      if (holds(middle))
        high = middle;
      else
        low = middle + 1;
    }
    return low;
  };
  return {first_that([&](std::uint64_t k) { return k == n || cdf(hits, static_cast<double>(k)) > 0.5 * rate; }),
          first_that(
              [&](std::uint64_t k) { return k == n || cdf(complement(hits, static_cast<double>(k))) <= 0.5 * rate; })};
}

/// Pointwise limits for the cumulative counts of n uniform numbers at 1/K, 2/K, ..., (K-1)/K.
struct envelope {
  std::vector<std::uint64_t> lower, upper;
};
inline envelope pointwise_envelope(std::uint64_t n, std::size_t points, double rate) {
  envelope e;
  for (std::size_t k = 1; k < points; ++k) {
    auto const [lower, upper] = hit_limits(n, static_cast<double>(k) / static_cast<double>(points), rate);
    e.lower.push_back(lower);
    e.upper.push_back(upper);
  }
  return e;
}

/// Exact probability that n uniform numbers leave an envelope somewhere: the
/// cumulative counts are a Markov chain, C_k - C_(k-1) ~ Bin(n - C_(k-1), 1/(K-k+1)).
inline double leaving_probability(std::uint64_t n, std::size_t points, envelope const& e) {
  std::vector<double> at{1.0};
  std::uint64_t from = 0;
  for (std::size_t k = 1; k < points; ++k) {
    double const step = 1.0 / static_cast<double>(points - k + 1);
    std::uint64_t const lower = e.lower[k - 1], upper = e.upper[k - 1];
    std::vector<double> next(static_cast<std::size_t>(upper - lower + 1));
    for (std::size_t a = 0; a < at.size(); ++a) {
      if (!(at[a] > 0.0)) continue;
      std::uint64_t const before = from + a, first = lower > before ? lower : before;
      if (first > upper) continue;
      double const left = static_cast<double>(n - before);
      boost::math::binomial_distribution<double, quiet> const gain(left, step);
      double mass = pdf(gain, static_cast<double>(first - before));
      for (std::uint64_t to = first; to <= upper; ++to) {
        next[static_cast<std::size_t>(to - lower)] += at[a] * mass;
        double const j = static_cast<double>(to - before);
        mass *= (left - j) / (j + 1.0) * (step / (1.0 - step));
      }
    }
    at = std::move(next);
    from = lower;
  }
  double inside = 0.0;
  for (double const p : at) inside += p;
  return inside < 1.0 ? 1.0 - inside : 0.0;
}

/// The widest envelope that n uniform numbers leave with probability at most `rate`, exactly.
inline envelope exact_envelope(std::uint64_t n, std::size_t points, double rate) {
  double low = rate / static_cast<double>(points), high = rate;  // one point alone, and all points apart
  envelope best = pointwise_envelope(n, points, low);
  for (int round = 0; round < 12; ++round) {
    double const middle = std::sqrt(low * high);
    envelope const tried = pointwise_envelope(n, points, middle);
    if (leaving_probability(n, points, tried) <= rate) {
      low = middle;
      best = tried;
    } else {
      high = middle;
    }
  }
  return best;
}

}  // namespace steelyard::inline v1::proof::detail
