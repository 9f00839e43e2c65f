// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/harder/fit_normal.hpp>
#include <steelyard/harder/population.hpp>
#include <steelyard/harder/rung_settings.hpp>

namespace steelyard::inline v1::detail {

inline constexpr std::size_t most_fitted = 300;  // words that a fitted move takes in

/// Normal deviates of the first k words of some particles in one half of the lineages, in two parts by lineage.
template <class X, class Wanted>
void points_of_half(population<X> const& all, std::size_t half, std::size_t k, Wanted wanted, weighted_points (&parts)[2]) {
  // More points than these tell little more, and cost k^2 each.
  std::size_t const enough = 4096 + 32 * k;
  std::size_t n = 0;
  all.each_of_half(half, [&](trail<X> const&, visit const& v, double) { n += wanted(v.words) ? 1u : 0u; });
  std::size_t const stride = n / enough + 1;
  std::size_t at = 0;
  all.each_of_half(half, [&](trail<X> const& t, visit const& v, double w) {
    if (!wanted(v.words) || at++ % stride != 0) return;
    weighted_points& part = parts[(t.lineage >> 1) & 1u];
    auto const words = t.words_of(v);
    for (std::size_t i = 0; i < k; ++i) part.rows.push_back(normal_from_word(words[i]));
    part.weights.push_back(w);
  });
}
/// Fits of a class for chains in one half of the lineages, from the other half.
template <class X, class Wanted>
void fit_class(population<X> const& all, std::size_t half, std::size_t k, Wanted wanted, word_class& cls) {
  weighted_points parts[2];
  points_of_half(all, 1 - half, k, wanted, parts);
  weighted_points points[2];
  bool const few = cls.words > 0 && k <= most_mixed;
  if (few)
    for (std::size_t h = 0; h < 2; ++h) points[h] = parts[h];
  cls.fits[half] = fit_normal(parts, k);
  if (few) cls.mixtures[half] = mixture_fit::of(cls.fits[half], points);
}

/// Classes of the weighed particles by the number of words used, with fits of each half from the other one. Numbers
/// with less than a twentieth of the weight make up the rest.
template <class X>
std::vector<word_class> find_classes(population<X> const& all, bool fitted) {
  std::vector<std::pair<std::size_t, double>> used;  // in rising order, with their weight
  double total = 0.0;
  for (std::size_t half = 0; half < 2; ++half)
    all.each_of_half(half, [&](trail<X> const&, visit const& v, double w) {
      auto at = std::lower_bound(used.begin(), used.end(), v.words, [](auto const& u, std::size_t words) { return u.first < words; });
      if (at == used.end() || at->first != v.words) at = used.insert(at, {v.words, 0.0});
      at->second += w;
      total += w;
    });
  std::vector<word_class> classes;
  for (auto const& [words, weight] : used) {
    if (weight < 0.05 * total || words == 0) continue;
    word_class cls;
    cls.words = words;
    for (std::size_t half = 0; half < 2 && fitted; ++half)
      fit_class(all, half, std::min(words, most_fitted), [&](std::size_t w) { return w == cls.words; }, cls);
    for (std::size_t half = 0; half < 2; ++half)  // one half may see no modes where the other does
      if (cls.mixtures[half].size() == 0 && cls.mixtures[1 - half].size() > 0 && cls.fits[half].size() > 0)
        cls.mixtures[half] = mixture_fit::of(cls.fits[half]);
    classes.push_back(std::move(cls));
  }
  word_class rest;
  std::size_t const shortest = std::min(used.front().first, most_fitted);
  auto const in_rest = [&](std::size_t words) {
    for (word_class const& each : classes)
      if (each.words == words) return false;
    return true;
  };
  for (std::size_t half = 0; half < 2 && fitted; ++half) fit_class(all, half, shortest, in_rest, rest);
  classes.push_back(std::move(rest));
  return classes;
}

}  // namespace steelyard::inline v1::detail
