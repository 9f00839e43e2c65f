// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <concepts>
#include <cstddef>
#include <span>
#include <type_traits>
#include <vector>

#include <steelyard/estimate/covariance.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/estimates.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/histogram_result.hpp>
#include <steelyard/estimate/moments.hpp>
#include <steelyard/estimate/quantile.hpp>

// An estimator fed with made-up blocks, and its answer as numbers to be compared.

namespace steelyard::inline v1::proof::detail {

namespace up = steelyard::v1::detail;

/// An answer of a type of one's own: `void numbers_of(answer const&, std::vector<double>&)` beside that type.
template <class Answer>
concept lists_its_numbers = requires(Answer const& answer, std::vector<double>& out) { numbers_of(answer, out); };

inline void put(estimate const& e, std::vector<double>& out) {
  out.push_back(e.value);
  out.push_back(e.standard_error);
}

/// Appends the numbers of an answer: of an estimate its value, then its standard error.
template <class Answer>
void list_numbers(Answer const& answer, std::vector<double>& out) {
  if constexpr (lists_its_numbers<Answer>) {
    numbers_of(answer, out);
  } else if constexpr (std::derived_from<Answer, estimate>) {
    put(answer, out);
  } else if constexpr (std::same_as<Answer, histogram_result>) {
    for (std::size_t b = 0; b < answer.size(); ++b) put(answer.probability(b), out);
    put(answer.below(), out);
    put(answer.above(), out);
  } else if constexpr (std::same_as<Answer, interval_result>) {
    put(answer.lower, out);
    put(answer.upper, out);
  } else if constexpr (std::same_as<Answer, moments_result>) {
    for (estimate const* each : {&answer.mean, &answer.sd, &answer.skewness, &answer.kurtosis}) put(*each, out);
  } else if constexpr (std::is_convertible_v<Answer, double>) {
    out.push_back(static_cast<double>(answer));
  } else if constexpr (requires { answer.begin() != answer.end(); }) {
    for (auto const& each : answer) list_numbers(each, out);
  } else {
    static_assert(
        std::is_convertible_v<Answer, double>,
        "steelyard: self_check() cannot read this answer: give its type a `numbers_of(answer, std::vector<double>&)`");
  }
}

/// Columns of values with their weights: what one or several `add` calls feed.
struct feed {
  std::vector<double> values, weights;  // values[c * weights.size() + i]
  double log_scale = 0.0;               // logarithm of what a weight of one stands for

  [[nodiscard]] feed part(std::size_t from, std::size_t to, std::size_t columns) const {
    feed f;
    std::size_t const n = weights.size();
    for (std::size_t c = 0; c < columns; ++c)
      for (std::size_t i = from; i < to; ++i) f.values.push_back(values[c * n + i]);
    f.weights.assign(weights.begin() + static_cast<std::ptrdiff_t>(from),
                     weights.begin() + static_cast<std::ptrdiff_t>(to));
    return f;
  }
  [[nodiscard]] feed scaled(double factor) const {
    feed f = *this;
    for (double& w : f.weights) w *= factor;
    f.log_scale -= std::log(factor);
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

/// The numbers of the answer where `all` is what was fed.
template <class E>
std::vector<double> answer_numbers(E const& e, feed const& all) {
  std::vector<double> out;
  if constexpr (up::states_its_error<E>) {
    run_facts facts;
    facts.drawn = all.weights.size();
    facts.maximum = all.log_scale;
    for (double const w : all.weights) {
      facts.sum += w;
      facts.sum_squares += w * w;
      facts.largest_unit = w > facts.largest_unit ? w : facts.largest_unit;
    }
    if (facts.sum > 0.0) facts.largest_unit /= facts.sum;
    list_numbers(e.answer(facts), out);
  } else {
    list_numbers(static_cast<double>(e.value()), out);
  }
  return out;
}

}  // namespace steelyard::inline v1::proof::detail
