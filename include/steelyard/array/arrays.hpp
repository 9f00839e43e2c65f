// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <memory>
#include <span>
#include <string>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/array/xtensor.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/estimate/covariance.hpp>
#include <steelyard/estimate/histogram_2d_result.hpp>
#include <steelyard/estimate/histogram_result.hpp>
#include <steelyard/sample/ensemble.hpp>
#include <steelyard/sample/weigh.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1 {

namespace detail {

template <class Shape>
struct fixed_product;
template <std::size_t... Extents>
struct fixed_product<xt::fixed_shape<Extents...>> {
  static constexpr std::size_t size = (Extents * ... * 1);
};

/// Rank of an expression where its shape fixes it, else 0.
template <class E>
inline constexpr std::size_t rank_of = 0;
template <class E>
  requires requires { std::tuple_size<typename E::shape_type>::value; }
inline constexpr std::size_t rank_of<E> = std::tuple_size<typename E::shape_type>::value;

/// xtensor expressions have overloads of `weigh` of their own.
template <class Range>
  requires(xt::is_xexpression<std::remove_cvref_t<Range>>::value)
inline constexpr bool weighed_as_array<Range> = true;

template <class Entry>
xt::xtensor<double, 2> filled(std::size_t rows, std::size_t columns, Entry entry) {
  xt::xtensor<double, 2> all = xt::xtensor<double, 2>::from_shape({rows, columns});
  for (std::size_t i = 0; i < rows; ++i)
    for (std::size_t j = 0; j < columns; ++j) all(i, j) = entry(i, j);
  return all;
}

}  // namespace detail

/// A readout may return a fixed xtensor: one column an element, in its own order.
template <class T, class Shape, xt::layout_type L>
  requires(detail::is_number_v<T>)
struct readout_columns<xt::xtensor_fixed<T, Shape, L>> {
  static constexpr std::size_t size = detail::fixed_product<Shape>::size;
  static void write(xt::xtensor_fixed<T, Shape, L> const& answer, double* first, std::size_t stride) {
    std::size_t k = 0;
    for (auto const each : answer) first[k++ * stride] = static_cast<double>(each);
  }
};

/// A view of numbers as an xtensor expression, without a copy: log-weights, states that are numbers.
/// It must not outlive what it looks at.
[[nodiscard]] inline auto as_xtensor(std::span<double const> view) {
  return xt::adapt(view.data(), view.size(), xt::no_ownership(), std::vector<std::size_t>{view.size()});
}

/// Densities of a histogram, and their standard errors, as arrays of one length.
[[nodiscard]] inline xt::xtensor<double, 1> densities(histogram_result const& histogram) {
  xt::xtensor<double, 1> all = xt::xtensor<double, 1>::from_shape({histogram.size()});
  for (std::size_t b = 0; b < histogram.size(); ++b) all(b) = histogram.density(b).value;
  return all;
}
[[nodiscard]] inline xt::xtensor<double, 1> density_errors(histogram_result const& histogram) {
  xt::xtensor<double, 1> all = xt::xtensor<double, 1>::from_shape({histogram.size()});
  for (std::size_t b = 0; b < histogram.size(); ++b) all(b) = histogram.density(b).standard_error;
  return all;
}
/// Edges of a histogram: one more than bins.
[[nodiscard]] inline xt::xtensor<double, 1> edges(histogram_result const& histogram) {
  xt::xtensor<double, 1> all = xt::xtensor<double, 1>::from_shape({histogram.size() + 1});
  for (std::size_t b = 0; b <= histogram.size(); ++b) all(b) = histogram.edge(b);
  return all;
}

/// Densities of a histogram in two dimensions, and their standard errors: x-bins by y-bins.
[[nodiscard]] inline xt::xtensor<double, 2> densities(histogram_2d_result const& histogram) {
  return detail::filled(histogram.x_size(), histogram.y_size(),
                        [&](std::size_t i, std::size_t j) { return histogram.density(i, j).value; });
}
[[nodiscard]] inline xt::xtensor<double, 2> density_errors(histogram_2d_result const& histogram) {
  return detail::filled(histogram.x_size(), histogram.y_size(),
                        [&](std::size_t i, std::size_t j) { return histogram.density(i, j).standard_error; });
}
/// A covariance matrix, and the standard error of each entry: N by N.
template <std::size_t N>
[[nodiscard]] xt::xtensor<double, 2> covariances(covariance_result<N> const& matrix) {
  return detail::filled(N, N, [&](std::size_t i, std::size_t j) { return matrix(i, j).value; });
}
template <std::size_t N>
[[nodiscard]] xt::xtensor<double, 2> covariance_errors(covariance_result<N> const& matrix) {
  return detail::filled(N, N, [&](std::size_t i, std::size_t j) { return matrix(i, j).standard_error; });
}

/// A readout of N columns of a row, from `first` on: for samples whose states are rows of an array.
/// It throws bad_readout on a row that is too short.
template <std::size_t N>
[[nodiscard]] auto row_columns(std::size_t first = 0) {
  return [first](std::span<double const> row) {
    if (row.size() < first + N)
      throw bad_readout("row_columns: a row of " + std::to_string(row.size()) + " numbers has no columns " +
                        std::to_string(first) + " to " + std::to_string(first + N - 1));
    std::array<double, N> part{};
    for (std::size_t k = 0; k < N; ++k) part[k] = row[first + k];
    return part;
  };
}

/// States that are numbers, as an array.
[[nodiscard]] inline xt::xtensor<double, 1> as_xtensor(ensemble<double> const& states) {
  xt::xtensor<double, 1> all = xt::xtensor<double, 1>::from_shape({states.size()});
  for (std::size_t s = 0; s < states.size(); ++s) all(s) = states[s];
  return all;
}

namespace detail {

/// Rows of an array of its own, as spans.
class array_rows {
 public:
  explicit array_rows(xt::xtensor<double, 2> numbers)
      : numbers_(std::make_unique<xt::xtensor<double, 2>>(std::move(numbers))) {
    std::size_t const width = numbers_->shape()[1];
    for (std::size_t i = 0; i < numbers_->shape()[0]; ++i) rows_.emplace_back(numbers_->data() + i * width, width);
  }
  [[nodiscard]] std::span<double const> const* data() const noexcept { return rows_.data(); }
  [[nodiscard]] std::size_t size() const noexcept { return rows_.size(); }

 private:
  std::unique_ptr<xt::xtensor<double, 2>> numbers_;
  std::vector<std::span<double const>> rows_;
};

}  // namespace detail

/// Weighs the numbers of a one-dimensional xtensor expression.
template <class E, class Weighter>
  requires(detail::rank_of<E> == 1)
auto weigh(xt::xexpression<E> const& numbers, Weighter const& weighter, weigh_options options = {}) {
  xt::xtensor<double, 1> const all = numbers.derived_cast();
  return weigh(std::vector<double>(all.begin(), all.end()), weighter, std::move(options));
}

/// Weighs the rows of a two-dimensional xtensor expression: each state is a
/// `std::span<double const>` over one row of a copy that the sample keeps.
template <class E, class Weighter>
  requires(detail::rank_of<E> == 2)
auto weigh(xt::xexpression<E> const& rows, Weighter const& weighter, weigh_options options = {}) {
  using X = std::span<double const>;
  constexpr bool fine = detail::may_weigh<true, Weighter, X>();
  if constexpr (fine) {
    detail::array_rows held{xt::xtensor<double, 2>(rows.derived_cast())};
    std::size_t const size = held.size();
    return detail::weigh_states<X>(std::move(held), size, weighter, std::move(options));
  } else {
    return detail::refused<weighted_sample<X>>();
  }
}

}  // namespace steelyard::inline v1
