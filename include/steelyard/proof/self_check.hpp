// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/count.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/accumulation.hpp>
#include <steelyard/estimate/estimates.hpp>
#include <steelyard/estimate/histogram_result.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/proof/chances.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/run/bytes.hpp>

namespace steelyard::inline v1::proof {

struct self_options {
  std::size_t columns = 1;     ///< readout columns that `add` expects
  std::size_t entries = 600;
  count seed = 1;
  double tolerance = 1e-9;     ///< relative, for what rounding alone may change
  /// Values to feed; standard exponentials unless given.
  std::function<double(draws&)> value = {};
};

namespace detail {

/// The numbers of an answer, to be compared.
inline void numbers_of(double answer, std::vector<double>& out) { out.push_back(answer); }
inline void numbers_of(estimate const& answer, std::vector<double>& out) {
  out.push_back(answer.value);
  out.push_back(answer.standard_error);
}
template <std::size_t N>
void numbers_of(estimates<N> const& answer, std::vector<double>& out) {
  for (estimate const& each : answer) numbers_of(each, out);
}
inline void numbers_of(histogram_result const& answer, std::vector<double>& out) {
  for (std::size_t b = 0; b < answer.size(); ++b) numbers_of(answer.probability(b), out);
  numbers_of(answer.below(), out);
  numbers_of(answer.above(), out);
}
inline void numbers_of(interval_result const& answer, std::vector<double>& out) {
  numbers_of(static_cast<estimate const&>(answer.lower), out);
  numbers_of(static_cast<estimate const&>(answer.upper), out);
}

/// Columns of values with their weights: what one or several `add` calls feed.
struct feed {
  std::vector<double> values, weights;  // values[c * weights.size() + i]

  [[nodiscard]] feed part(std::size_t from, std::size_t to, std::size_t columns) const {
    feed f;
    std::size_t const n = weights.size();
    for (std::size_t c = 0; c < columns; ++c)
      for (std::size_t i = from; i < to; ++i) f.values.push_back(values[c * n + i]);
    f.weights.assign(weights.begin() + static_cast<std::ptrdiff_t>(from), weights.begin() + static_cast<std::ptrdiff_t>(to));
    return f;
  }
  [[nodiscard]] feed scaled(double factor) const {
    feed f = *this;
    for (double& w : f.weights) w *= factor;
    return f;
  }
};

template <class E>
void add_feed(E& e, feed const& f) {
  if constexpr (up::states_its_error<E>) {
    weighted_view v;
    v.values = f.values;
    v.weights = f.weights;
    e.add(v.values, v.weights, v);
  } else {
    e.add(std::span<double const>(f.values), std::span<double const>(f.weights));
  }
}

template <class E>
std::vector<double> answer_numbers(E const& e, feed const& all) {
  std::vector<double> out;
  if constexpr (up::states_its_error<E>) {
    run_facts facts;
    facts.drawn = all.weights.size();
    for (double const w : all.weights) {
      facts.sum += w;
      facts.sum_squares += w * w;
      facts.largest_unit = w > facts.largest_unit ? w : facts.largest_unit;
    }
    if (facts.sum > 0.0) facts.largest_unit /= facts.sum;
    numbers_of(e.answer(facts), out);
  } else {
    numbers_of(static_cast<double>(e.value()), out);
  }
  return out;
}

}  // namespace detail

/// Whether an estimator of your own keeps the laws its engine relies on, fed
/// with made-up numbers: parts merge to the whole in any grouping, an empty part
/// changes nothing, a factor on all weights changes no answer, nor does the
/// order of the entries; an entry split in two shares its value; all-zero
/// weights are taken without harm; and `fields` carries everything through bytes.
///   the first law broken is named, with both numbers
template <class E>
  requires estimator<E>
check self_check(E const& estimator_, self_options const& options = {}) {
  std::size_t const n = options.entries, c = options.columns;
  if (n < 16) throw bad_argument("self_check: at least 16 entries are needed");
  draws source(options.seed, 0, purpose::calibration, 5);
  detail::feed all;
  for (std::size_t k = 0; k < c * n; ++k) all.values.push_back(options.value ? options.value(source) : source.exponential(1.0));
  for (std::size_t i = 0; i < n; ++i) all.weights.push_back(0.01 + source.uniform());
  E prepared = estimator_.fresh();
  if constexpr (detail::up::prepares<E>) prepared.prepare(std::span<double const>(all.values), std::span<double const>(all.weights));
  auto const fed = [&](auto const&... parts) {
    E e = prepared.fresh();
    (detail::add_feed(e, parts), ...);
    return e;
  };
  std::vector<double> const whole = detail::answer_numbers(fed(all), all);
  std::string broken;
  auto const same = [&](char const* law, E const& e, detail::feed const& f, bool first_only = false) {
    if (!broken.empty()) return;
    std::vector<double> const other = detail::answer_numbers(e, f);
    for (std::size_t k = 0; k < (first_only ? 1 : whole.size()); ++k) {
      double const size = std::abs(whole[k]) > 1e-12 ? std::abs(whole[k]) : 1e-12;
      if (!(std::abs(other[k] - whole[k]) <= options.tolerance * size))
        broken = std::string(law) + ": number " + std::to_string(k) + " of the answer is " + detail::up::plain_number(other[k]) +
                 " instead of " + detail::up::plain_number(whole[k]);
      if (!broken.empty()) return;
    }
  };
  detail::feed const a = all.part(0, n / 3, c), b = all.part(n / 3, n / 2, c), d = all.part(n / 2, n, c);
  same("adding in several calls differs from adding in one", fed(a, b, d), all);
  {
    E left = fed(a), right = fed(b);
    left += right;
    left += fed(d);
    same("parts merged from the left differ from the whole", left, all);
    E first = fed(a);
    right += fed(d);
    first += right;
    same("parts merged from the right differ from the whole", first, all);
    E empty = prepared.fresh();
    empty += fed(all);
    empty += prepared.fresh();
    same("an empty part changes the answer", empty, all);
  }
  {
    E scaled = fed(all.scaled(8.0));
    scaled.rescale(0.125);
    same("rescale(1/8) does not undo a factor of 8", scaled, all);
    E half = fed(a.scaled(4.0)), rest = fed(b, d);
    half.rescale(0.25);
    half += rest;
    same("a rescaled part does not merge with the others", half, all);
    same("a factor on all weights changes the answer", fed(all.scaled(1e-3)), all.scaled(1e-3));
  }
  {
    detail::feed reversed = all;
    for (std::size_t k = 0; k < c; ++k)
      for (std::size_t i = 0; i < n; ++i) reversed.values[k * n + i] = all.values[k * n + (n - 1 - i)];
    for (std::size_t i = 0; i < n; ++i) reversed.weights[i] = all.weights[n - 1 - i];
    same("the order of the entries changes the answer", fed(reversed), reversed);
    detail::feed split = all.part(0, 1, c);
    split.weights[0] *= 0.5;
    same("an entry split in two of half the weight changes the value", fed(split, split, all.part(1, n, c)), all, true);
    detail::feed zeros = all.part(0, n, c);
    for (double& w : zeros.weights) w = 0.0;
    E with_zeros = fed(all);
    detail::add_feed(with_zeros, zeros);
    same("entries of weight zero change the value", with_zeros, all, true);
  }
  {
    E const from = fed(all);
    detail::up::byte_writer out;
    out.put_each(E::fields(from));
    E to = prepared.fresh();
    detail::up::byte_reader in(out.bytes());
    in.get_each(E::fields(to));
    same("fields() does not carry everything that was accumulated", to, all);
  }
  if (!broken.empty()) return {outcome::failed, broken};
  return {outcome::passed, "merging, rescaling, permutation, splitting, empty and zero parts and fields() all hold"};
}

}  // namespace steelyard::inline v1::proof
