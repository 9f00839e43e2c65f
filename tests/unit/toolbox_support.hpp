// SPDX-License-Identifier: BSL-1.0
#pragma once

// The toolbox questions for laws that hold for every estimator: their answers
// as bits, and compared within rounding.

#include <array>
#include <cstddef>
#include <cstdint>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/core.hpp>

#include "law_support.hpp"

namespace law {

inline void put(all_bits& to, sy::moments_result const& m) {
  for (sy::estimate const& each : {m.mean, m.sd, m.skewness, m.kurtosis}) put(to, each);
}
inline void put(all_bits& to, sy::correlation_result const& r) {
  put(to, static_cast<sy::estimate const&>(r));
  put(to, r.error_interval(0.9));
}
template <std::size_t N>
void put(all_bits& to, sy::covariance_result<N> const& c) {
  for (std::size_t i = 0; i < N; ++i)
    for (std::size_t j = 0; j < N; ++j) {
      put(to, c(i, j));
      put(to, c.correlation(i, j));
    }
}
inline void put(all_bits& to, sy::shortest_interval_result const& s) {
  for (sy::estimate const& each : {s.lower, s.upper, s.width}) put(to, each);
}
inline void put(all_bits& to, sy::cumulative_result const& c) {
  to.push_back(c.size());
  for (std::size_t i = 0; i < c.size(); i += 1 + c.size() / 50) {
    put(to, c.value(i));
    put(to, c.step(i));
  }
  for (double const x : {-9.0, 0.0, 0.5, 9.0}) put(to, c.at(x));
  put(to, c.quantile(0.3));
}
inline void put(all_bits& to, sy::cumulative_points_result const& c) {
  for (sy::estimate const& each : c.shares) put(to, each);
}
inline void put(all_bits& to, sy::mode_result const& m) {
  to.push_back(m.bin());
  put(to, m.density());
  put(to, m.error_interval(0.9));
}
inline void put(all_bits& to, sy::histogram_2d_result const& h) {
  for (std::size_t i = 0; i < h.x_size(); ++i)
    for (std::size_t j = 0; j < h.y_size(); ++j) put(to, h.probability(i, j));
  for (sy::estimate const& each : {h.outside(), h.x_below(), h.x_above(), h.y_below(), h.y_above(), h.not_a_number()})
    put(to, each);
  for (std::size_t i = 0; i <= h.x_size(); ++i) put(to, h.x_edge(i));
  for (std::size_t j = 0; j <= h.y_size(); ++j) put(to, h.y_edge(j));
}

/// Everything the answers say, as bits.
template <class... As>
all_bits toolbox_bits(sy::answers<As...> const& answers) {
  all_bits all;
  [&]<std::size_t... I>(std::index_sequence<I...>) { (put(all, answers.template get<I>()), ...); }
  (std::index_sequence_for<As...>());
  put(all, answers.diagnosis());
  put(all, answers.diagnosis().tail_index());
  return all;
}

/// Every estimate that an answer holds, in one order.
using all_estimates = std::vector<sy::estimate>;
inline all_estimates estimates_of(sy::estimate const& e) { return {e}; }
inline all_estimates estimates_of(sy::moments_result const& m) { return {m.mean, m.sd, m.skewness, m.kurtosis}; }
template <std::size_t N>
all_estimates estimates_of(sy::covariance_result<N> const& c) {
  all_estimates all;
  for (std::size_t i = 0; i < N; ++i)
    for (std::size_t j = 0; j <= i; ++j) {
      all.push_back(c(i, j));
      if (i != j) all.push_back(c.correlation(i, j));
    }
  return all;
}
inline all_estimates estimates_of(sy::shortest_interval_result const& s) { return {s.lower, s.upper, s.width}; }
inline all_estimates estimates_of(sy::cumulative_result const& c) {
  return {c.at(-0.5), c.at(0.0), c.at(0.5), c.at(1.5), c.at(9.0), c.quantile(0.4)};
}
inline all_estimates estimates_of(sy::cumulative_points_result const& c) { return c.shares; }
inline all_estimates estimates_of(sy::mode_result const& m) { return {m.density()}; }
inline all_estimates estimates_of(sy::histogram_2d_result const& h) {
  all_estimates all{h.outside(), h.x_below(), h.x_above(), h.y_below(), h.y_above(), h.not_a_number()};
  for (std::size_t i = 0; i < h.x_size(); ++i)
    for (std::size_t j = 0; j < h.y_size(); ++j) all.push_back(h.probability(i, j));
  return all;
}
template <class... As>
all_estimates estimates_of(sy::answers<As...> const& answers) {
  all_estimates all;
  auto const take = [&](auto const& one) {
    for (sy::estimate const& each : estimates_of(one)) all.push_back(each);
  };
  [&]<std::size_t... I>(std::index_sequence<I...>) { (take(answers.template get<I>()), ...); }
  (std::index_sequence_for<As...>());
  return all;
}

inline double scaled_square(double x) { return 0.5 * x * x; }
inline std::array<double, 3> with_powers(double x) { return {x, x * x, x < 0.3 ? 1.0 : -0.5 * x}; }

/// Toolbox questions that one pass can answer, on states that are numbers.
inline auto one_pass_toolbox() {
  return std::tuple(sy::moments(itself), sy::correlation(itself, scaled_square), sy::covariance(with_powers),
                    sy::cumulative(itself, {-0.25, 0.5, 1.75}), sy::mode(itself, sy::equal_bins(-1.0, 2.0, 4)),
                    sy::histogram_2d(itself, scaled_square, sy::equal_bins(-1.0, 1.0, 3), sy::bins({0.0, 0.1, 1.0})));
}
/// And those that need the whole sample.
inline auto kept_toolbox() {
  return std::tuple_cat(one_pass_toolbox(), std::tuple(sy::shortest_interval(itself, 0.7), sy::cumulative(itself)));
}
template <class X>
auto ask_toolbox(sy::weighted_sample<X> const& sample) {
  return std::apply([&](auto const&... each) { return sample.estimate(each...); }, kept_toolbox());
}
/// The same with automatic edges and the diagnosis, in one pass or kept.
inline auto one_pass_toolbox_and_edges() {
  return std::tuple_cat(one_pass_toolbox(),
                        std::tuple(sy::mode(itself), sy::histogram_2d(itself, scaled_square), sy::health()));
}
template <class X>
auto ask_one_pass_toolbox(sy::weighted_sample<X> const& sample) {
  return std::apply([&](auto const&... each) { return sample.estimate(each...); }, one_pass_toolbox_and_edges());
}
template <class Pipeline>
auto ask_one_pass_toolbox(Pipeline const& pipe, sy::plan const& plan) {
  return std::apply([&](auto const&... each) { return pipe.estimate(plan, each...); }, one_pass_toolbox_and_edges());
}

}  // namespace law
