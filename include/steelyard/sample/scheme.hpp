// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/count.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/sample/multinomial.hpp>
#include <steelyard/sample/residual.hpp>
#include <steelyard/sample/stratified.hpp>
#include <steelyard/sample/systematic.hpp>
#include <steelyard/sample/without_replacement.hpp>

namespace steelyard::inline v1 {

/// How states are drawn in proportion to their weights. The first four draw
/// with replacement and give equal slots; the last two draw each state at most
/// once, and every slot carries a weight.
enum class scheme {
  systematic,   ///< one uniform number and equal steps: copies differ from k W by less than one
  multinomial,  ///< independently
  stratified,   ///< one uniform number in each of k equal strata
  residual,     ///< the whole part of k W for certain, the rest independently
  priority,     ///< without replacement, the k largest of w/U        [Duffield, Lund & Thorup 2007]
  successive,   ///< without replacement, one after another in proportion to what is left  [Efraimidis & Spirakis 2006]
};

struct resample_options {
  count seed = 1;
  steelyard::scheme scheme = steelyard::scheme::systematic;
  bool shuffled = true;  ///< slots in random order, so that any part of them is a fair sample
};

namespace detail {

/// Random order, each as likely.                               [Fisher & Yates 1938; Durstenfeld 1964]
template <class Swap>
void shuffle(std::size_t n, draws& source, Swap swap) {
  for (std::size_t i = n; i > 1; --i) swap(i - 1, static_cast<std::size_t>(source.index(i)));
}
template <class T>
void shuffle(std::vector<T>& all, draws& source) {
  shuffle(all.size(), source, [&](std::size_t i, std::size_t j) { std::swap(all[i], all[j]); });
}
inline void shuffle(drawn_slots& slots, draws& source) {
  shuffle(slots.positions.size(), source, [&](std::size_t i, std::size_t j) {
    std::swap(slots.positions[i], slots.positions[j]);
    if (!slots.weights.empty()) std::swap(slots.weights[i], slots.weights[j]);
  });
}

/// Slots as positions in rising order, and what each weighs where they are not equal.
inline drawn_slots draw_slots(scheme how, std::span<double const> weights, std::size_t k, draws& source) {
  switch (how) {
    case scheme::multinomial: return {multinomial_positions(weights, k, source), {}};
    case scheme::stratified: return {stratified_positions(weights, k, source), {}};
    case scheme::residual: return {residual_positions(weights, k, source), {}};
    case scheme::priority: return drawn_once(weights, k, false, source);
    case scheme::successive: return drawn_once(weights, k, true, source);
    case scheme::systematic: break;
  }
  return {systematic_positions(weights, k, source.uniform()), {}};
}

/// Variance of the mean over k equal slots, given weights and values. @pre a scheme with replacement
inline double resampling_variance(scheme how, std::span<double const> weights, std::span<double const> values,
                                  std::size_t k) {
  return how == scheme::systematic   ? systematic_variance(weights, values, k)
         : how == scheme::stratified ? stratified_variance(weights, values, k)
         : how == scheme::residual   ? residual_variance(weights, values, k)
                                     : multinomial_variance(weights, values, k);
}

}  // namespace detail

}  // namespace steelyard::inline v1
