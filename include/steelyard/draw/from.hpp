// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>

#include <steelyard/base/bits.hpp>
#include <steelyard/draw/discrete.hpp>
#include <steelyard/draw/inversion.hpp>

namespace steelyard::inline v1::detail {

/// The number type a distribution computes in: its `value_type`, else double.
template <class Distribution>
struct number_of {
  using type = double;
};
template <class Distribution>
  requires requires { typename Distribution::value_type; }
struct number_of<Distribution> {
  using type = typename Distribution::value_type;
};

template <class Distribution>
inline constexpr bool has_quantiles = requires(Distribution const& d, typename number_of<Distribution>::type p) {
  quantile(d, p);
  quantile(complement(d, p));
};

template <class Distribution>
inline constexpr bool has_steps = has_quantiles<Distribution> &&
                                  requires(Distribution const& d, typename number_of<Distribution>::type k) {
                                    cdf(d, k);
                                    cdf(complement(d, k));
                                    support(d).first;
                                    support(d).second;
                                  };

/// The deviate of a continuous distribution that belongs to a word, from the
/// quantile of the nearer tail; names are found beside the distribution.
template <class Distribution>
auto deviate_from_word(Distribution const& distribution, std::uint64_t word) {
  using number = typename number_of<Distribution>::type;
  tail const t = tail_from_word(word);
  auto const beyond = static_cast<number>(t.probability);
  return t.lower ? static_cast<number>(quantile(distribution, beyond))
                 : static_cast<number>(quantile(complement(distribution, beyond)));
}

template <class Number>
Number whole_part(Number x) noexcept {
  constexpr Number largest = 9.0e15;  // above, every double is whole
  return x < largest && x > -largest ? static_cast<Number>(static_cast<std::int64_t>(x)) : x;
}

/// The smallest whole k in the support with cdf(k) >= u, u the probability
/// that belongs to a word. Which side of a step `quantile` rounds to is left
/// open by its policy, so it gives only the place where the search starts;
/// the tail nearer to u decides each comparison.
/// Cost  one quantile, two or three distribution functions.
template <class Distribution>
auto smallest_count_from_word(Distribution const& distribution, std::uint64_t word) {
  using number = typename number_of<Distribution>::type;
  tail const t = tail_from_word(word);
  auto const beyond = static_cast<number>(t.probability);
  auto const ends = support(distribution);
  auto const lowest = static_cast<number>(ends.first);
  auto const highest = static_cast<number>(ends.second);
  auto const reached = [&](number k) {
    return t.lower ? cdf(distribution, k) >= beyond : cdf(complement(distribution, k)) <= beyond;
  };
  auto const between = [&](number below, number at) {  // not reached at `below`, reached at `at`
    while (at - below > number(1)) {
      number const middle = whole_part(below + (at - below) / number(2));
      if (!(middle > below) || !(middle < at)) break;
      (reached(middle) ? at : below) = middle;
    }
    return at;
  };

  auto const guess = static_cast<number>(t.lower ? quantile(distribution, beyond)
                                                 : quantile(complement(distribution, beyond)));
  number start = is_finite(static_cast<double>(guess)) ? whole_part(guess) : lowest;
  if (start < lowest) start = lowest;
  if (start > highest) start = highest;
  number step = 1;
  if (reached(start)) {
    while (start > lowest) {
      number const next = start - lowest > step ? start - step : lowest;
      if (!reached(next)) return between(next, start);
      start = next;
      step += step;
    }
    return lowest;
  }
  while (start < highest) {
    number const next = highest - start > step ? start + step : highest;
    if (reached(next)) return between(start, next);
    start = next;
    step += step;
  }
  return highest;
}

}  // namespace steelyard::inline v1::detail
