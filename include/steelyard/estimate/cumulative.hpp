// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/quantile.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// The weighted distribution function F(x) = share of the weight at or below x,
/// a step function: rises at value(i) to the height step(i).
/// Error intervals hold at each x on its own, not for the whole curve at once.
class cumulative_result {
 public:
  explicit cumulative_result(std::shared_ptr<detail::weighted_column const> column) : column_(std::move(column)) {
    column_->look_into_all();
    for (std::size_t i = 0; i < column_->size(); ++i)
      if (i + 1 == column_->size() || column_->value(i) < column_->value(i + 1)) ends_.push_back(i + 1);
  }

  /// Number of steps: distinct readouts of positive weight.
  [[nodiscard]] std::size_t size() const noexcept { return ends_.size(); }
  /// Where step i lies, in rising order. @throws bad_argument past the end.
  double value(std::size_t i) const { return column_->value(end(i) - 1); }
  /// F there. @throws bad_argument past the end.
  estimate step(std::size_t i) const { return column_->probability_of_first(end(i)); }
  /// F(x); never or always seen outside the readouts. @throws bad_argument unless x is finite.
  estimate at(double x) const {
    if (!detail::is_finite(x))
      throw bad_argument("cumulative: " + detail::plain_number(x) + " is no point; a finite number is needed");
    std::size_t below = 0, above = size();
    while (below < above) {
      std::size_t const middle = below + (above - below) / 2;
      if (column_->value(ends_[middle] - 1) <= x)
        below = middle + 1;
      else
        above = middle;
    }
    return column_->probability_of_first(below == 0 ? 0 : ends_[below - 1]);
  }
  /// inf{x : F(x) >= p}. @throws bad_argument unless 0 < p < 1.
  quantile_result quantile(double p) const { return {column_, detail::checked_level("quantile", p)}; }

 private:
  [[nodiscard]] std::size_t end(std::size_t i) const {
    if (i >= size())
      throw bad_argument("cumulative: there is no step " + std::to_string(i) + " among " + std::to_string(size()));
    return ends_[i];
  }

  std::shared_ptr<detail::weighted_column const> column_;
  std::vector<std::size_t> ends_;  // of each step: entries up to it
};

/// F as a step function, on a kept sample. Memory: 24 bytes an entry of positive weight.
template <class Readout>
class cumulative_estimator : public detail::column_estimator<Readout> {
 public:
  explicit cumulative_estimator(Readout its_readout) : detail::column_estimator<Readout>(std::move(its_readout)) {}

  [[nodiscard]] cumulative_estimator fresh() const { return cumulative_estimator(this->readout()); }
  [[nodiscard]] cumulative_result answer(run_facts const& facts) const { return answer_from(this->parts(), facts); }
  [[nodiscard]] cumulative_result answer_from(detail::column_parts const& all, run_facts const& facts) const {
    return cumulative_result(this->column(all, facts));
  }
};

/// F at chosen points, each a probability.
struct cumulative_points_result {
  std::vector<double> points;
  std::vector<estimate> shares;  ///< F at each of them
};

/// F at chosen points, in one pass: share of the weight at or below each.
///   u = W (1{f <= x} - F(x))
template <class Readout>
class cumulative_points_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 1;

  /// @throws bad_argument unless the points are finite and rise strictly, and there is one.
  cumulative_points_estimator(Readout its_readout, std::vector<double> points)
      : readout_(std::move(its_readout)), points_(std::move(points)), cells_(points_.size() + 1) {
    if (points_.empty()) throw bad_argument("cumulative: no points were given; at least one is needed");
    for (std::size_t j = 0; j < points_.size(); ++j)
      if (!detail::is_finite(points_[j]) || (j > 0 && !(points_[j - 1] < points_[j])))
        throw bad_argument("cumulative: point " + std::to_string(j) + " is " + detail::plain_number(points_[j]) +
                           "; points must be finite and rise strictly");
  }

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }
  [[nodiscard]] cumulative_points_estimator fresh() const { return {readout_, points_}; }

  void add(std::span<double const> values, std::span<double const> weights, weighted_view const& view) {
    if (view.groups.empty() && view.counts.empty() && points_.size() <= 32) {
      detail::add_to_cells(cells_, values, weights, [&](std::span<double const> some, std::uint64_t* cells) {
        double const* const x = some.data();
        std::size_t const n = some.size();
        std::fill(cells, cells + n, std::uint64_t{0});
        for (double const point : points_)  // without branches, which could not be foretold
          for (std::size_t i = 0; i < n; ++i) cells[i] += point < x[i] ? 1u : 0u;
      });
      return;
    }
    detail::grouped_cells block;
    for (std::size_t i = 0; i < weights.size(); ++i) {
      auto const cell =
          static_cast<std::size_t>(std::lower_bound(points_.begin(), points_.end(), values[i]) - points_.begin());
      cells_[cell].add(view.count(i), weights[i]);
      if (!view.groups.empty()) block.add(view.groups[i], static_cast<std::uint32_t>(cell), view.count(i) * weights[i]);
    }
    groups_ += block;
  }
  void rescale(double factor) {
    for (detail::cell_sums& each : cells_) each.rescale(factor);
    groups_.rescale(factor);
  }
  cumulative_points_estimator& operator+=(cumulative_points_estimator const& other) {
    for (std::size_t c = 0; c < cells_.size(); ++c) cells_[c] += other.cells_[c];
    groups_ += other.groups_;
    return *this;
  }

  [[nodiscard]] cumulative_points_result answer(run_facts const& facts) const {
    std::vector<detail::cell_sums> above(cells_.size());
    for (std::size_t c = cells_.size() - 1; c-- > 0;) (above[c] = above[c + 1]) += cells_[c + 1];
    cumulative_points_result result{points_, {}};
    detail::cell_sums in;
    for (std::size_t j = 0; j < points_.size(); ++j) {
      in += cells_[j];
      error_terms const terms = facts.groups > 0.0 ? groups_.terms([j](std::uint32_t cell) { return cell <= j; },
                                                                   [](std::uint32_t) { return true; })
                                                   : detail::share_terms(in, above[j]);
      result.shares.push_back(
          detail::share_estimate(in.weight, above[j].weight, terms, in.weight > 0.0, above[j].weight > 0.0, facts));
    }
    return result;
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.cells_), detail::grouped_cells::fields(self.groups_));
  }

 private:
  Readout readout_;
  std::vector<double> points_;
  std::vector<detail::cell_sums> cells_;
  detail::grouped_cells groups_;
};

/// The weighted distribution function of a scalar readout, on a kept sample.
template <class Readout>
[[nodiscard]] auto cumulative(Readout readout) {
  return cumulative_estimator<Readout>(std::move(readout));
}
/// The weighted distribution function at chosen points, in one pass.
/// @throws bad_argument unless the points are finite and rise strictly, and there is one.
template <class Readout>
[[nodiscard]] auto cumulative(Readout readout, std::vector<double> points) {
  return cumulative_points_estimator<Readout>(std::move(readout), std::move(points));
}

}  // namespace steelyard::inline v1
