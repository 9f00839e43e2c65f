// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/histogram_result.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// Weighted histogram of a scalar readout: what fell into each bin, below, above
/// and at NaN, each as a share of the whole with its own error bar.
///   se^2 = c sum u^2, u = W (1_bin - p)
template <class Readout>
class histogram_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 1;
  static constexpr bool takes_not_finite = true;

  histogram_estimator(Readout its_readout, std::optional<bins> edges)
      : readout_(std::move(its_readout)), edges_(std::move(edges)) {
    if (edges_) cells_.resize(edges_->size() + 3);
    chosen_ = edges_.has_value();
  }

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }
  [[nodiscard]] histogram_estimator fresh() const { return histogram_estimator(readout_, edges_); }

  [[nodiscard]] bool wants_pilot() const noexcept { return !chosen_; }
  /// Chooses the edges where none were given.
  void prepare(std::span<double const> values, std::span<double const> weights) {
    if (chosen_) return;
    std::vector<std::pair<double, double>> pilot;
    pilot.reserve(values.size());
    for (std::size_t i = 0; i < values.size(); ++i) pilot.emplace_back(values[i], weights[i]);
    edges_ = detail::choose_bins(std::move(pilot), 1.0);
    cells_.assign(edges_->size() + 3, {});
  }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    if (view.groups.empty() && view.counts.empty()) {
      detail::add_to_cells(cells_, values, weights,
                           [&](std::span<double const> some, std::uint64_t* cells) { edges_->cells(some, cells); });
      return;
    }
    if (view.groups.empty()) {
      for (std::size_t i = 0; i < weights.size(); ++i)
        cells_[edges_->cell(values[i])].add(view.count(i), weights[i]);
      return;
    }
    detail::grouped_cells block;
    for (std::size_t i = 0; i < weights.size(); ++i) {
      std::size_t const cell = edges_->cell(values[i]);
      cells_[cell].add(view.count(i), weights[i]);
      block.add(view.groups[i], static_cast<std::uint32_t>(cell), view.count(i) * weights[i]);
    }
    block.settle();
    groups_ += block;
  }
  void rescale(double factor) {
    for (detail::cell_sums& each : cells_) each.rescale(factor);
    groups_.rescale(factor);
  }
  histogram_estimator& operator+=(histogram_estimator const& other) {
    for (std::size_t b = 0; b < cells_.size(); ++b) cells_[b] += other.cells_[b];
    groups_ += other.groups_;
    return *this;
  }

  [[nodiscard]] histogram_result answer(run_facts const& facts) const {
    return histogram_result(edges_ ? *edges_ : detail::choose_bins({}, 1.0), cells_, groups_, facts);
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.cells_), detail::grouped_cells::fields(self.groups_));
  }

 private:
  Readout readout_;
  std::optional<bins> edges_;
  bool chosen_ = false;
  std::vector<detail::cell_sums> cells_;
  detail::grouped_cells groups_;
};

/// Weighted histogram over given bins: `equal_bins`, `log_bins`, `bins{edges}`.
template <class Readout>
[[nodiscard]] auto histogram(Readout readout, bins edges) {
  return histogram_estimator<Readout>(std::move(readout), std::move(edges));
}
/// Weighted histogram over edges chosen from the first entries of positive weight.
template <class Readout>
[[nodiscard]] auto histogram(Readout readout, automatic_bins_t = automatic_bins) {
  return histogram_estimator<Readout>(std::move(readout), std::nullopt);
}
template <class Readout, class Edges>
  requires(!detail::are_edges_v<Edges>)
[[nodiscard]] auto histogram(Readout readout, Edges const&) {
  static_assert(detail::are_edges_v<Edges>,
                "steelyard: a histogram takes bins: equal_bins(lower, upper, n), log_bins, bins{edges} or automatic_bins");
  return histogram_estimator<Readout>(std::move(readout), std::nullopt);
}

}  // namespace steelyard::inline v1
