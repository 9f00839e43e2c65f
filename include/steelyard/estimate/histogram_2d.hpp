// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/histogram_2d_result.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// Weighted histogram of two scalar readouts: what fell into each cell, and
/// outside, each as a share of the whole with its own error bar. Only cells that hold something take memory.
///   se^2 = c sum u^2, u = W (1_cell - p)
template <class First, class Second>
class histogram_2d_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 2;
  static constexpr bool takes_not_finite = true;

  histogram_2d_estimator(First first, Second second, std::optional<bins> x, std::optional<bins> y)
      : readouts_(std::move(first), std::move(second)), x_(std::move(x)), y_(std::move(y)), wants_pilot_(!x_ || !y_) {}

  [[nodiscard]] std::tuple<First, Second> const& readout() const noexcept { return readouts_; }
  [[nodiscard]] histogram_2d_estimator fresh() const {
    return {std::get<0>(readouts_), std::get<1>(readouts_), x_, y_};
  }

  [[nodiscard]] bool wants_pilot() const noexcept { return wants_pilot_; }
  /// Chooses the edges where none were given.
  void prepare(std::span<double const> values, std::span<double const> weights) {
    auto const choose = [&](std::optional<bins>& edges, std::size_t first) {
      if (edges) return;
      std::vector<std::pair<double, double>> pilot;
      for (std::size_t i = 0; i < weights.size(); ++i) pilot.emplace_back(values[first + i], weights[i]);
      edges = detail::choose_bins(std::move(pilot), 2.0);
    };
    choose(x_, 0);
    choose(y_, weights.size());
    wants_pilot_ = false;
  }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    std::size_t const n = weights.size(), row = y_->size() + 3;
    detail::group_sums<3> block;
    detail::grouped_cells of_groups;
    for (std::size_t i = 0; i < n; ++i) {
      auto const cell = static_cast<std::uint32_t>(x_->cell(values[i]) * row + y_->cell(values[n + i]));
      detail::cell_sums one;
      one.add(view.count(i), weights[i]);
      block.push(cell, {one.weight, one.second, one.fourth});
      if (!view.groups.empty()) of_groups.add(view.groups[i], cell, view.count(i) * weights[i]);
    }
    block.settle();
    cells_ += block;
    groups_ += of_groups;
  }
  void rescale(double factor) {
    cells_.for_each([&](auto& sums) {
      double const square = factor * factor;
      sums[0] *= factor;
      sums[1] *= square;
      sums[2] *= square * square;
    });
    groups_.rescale(factor);
  }
  histogram_2d_estimator& operator+=(histogram_2d_estimator const& other) {
    cells_ += other.cells_;
    groups_ += other.groups_;
    return *this;
  }

  [[nodiscard]] histogram_2d_result answer(run_facts const& facts) const {
    auto const edges = [](std::optional<bins> const& chosen) {
      return chosen ? *chosen : detail::choose_bins({}, 2.0);
    };
    return {edges(x_), edges(y_), cells_, groups_, facts};
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(detail::group_sums<3>::fields(self.cells_), detail::grouped_cells::fields(self.groups_));
  }

 private:
  std::tuple<First, Second> readouts_;
  std::optional<bins> x_, y_;
  bool wants_pilot_;
  detail::group_sums<3> cells_;
  detail::grouped_cells groups_;
};

namespace detail {

inline std::optional<bins> given_edges(bins edges) { return edges; }
inline std::optional<bins> given_edges(automatic_bins_t) { return std::nullopt; }

}  // namespace detail

/// Weighted histogram of two readouts over given bins: `equal_bins`, `log_bins`, `bins{edges}`; or, for either of
/// them, `automatic_bins`.
template <class First, class Second, class X = automatic_bins_t, class Y = automatic_bins_t>
[[nodiscard]] auto histogram_2d(First first, Second second, X x = {}, Y y = {}) {
  constexpr bool fine = detail::are_edges_v<X> && detail::are_edges_v<Y>;
  static_assert(fine,
                "steelyard: histogram_2d() takes bins for each readout: equal_bins(lower, upper, n), log_bins, "
                "bins{edges} or automatic_bins");
  if constexpr (fine)
    return histogram_2d_estimator<First, Second>(std::move(first), std::move(second), detail::given_edges(std::move(x)),
                                                 detail::given_edges(std::move(y)));
  else
    return histogram_2d_estimator<First, Second>(std::move(first), std::move(second), std::nullopt, std::nullopt);
}

}  // namespace steelyard::inline v1
