// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <limits>
#include <memory>
#include <span>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/student.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1::detail {

/// The values of one readout in rising order with their weights: what a
/// quantile and its Woodruff limits are read from, at any level.
/// Memory: 16 bytes an entry, 8 more with counts, 4 more with groups.
class weighted_column {
 public:
  weighted_column(weighted_view const& view, run_facts const& facts) : facts_(facts) {
    std::size_t const n = view.weights.size();
    std::vector<std::size_t> order(n);
    for (std::size_t i = 0; i < n; ++i) order[i] = i;
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return view.values[a] < view.values[b]; });
    values_.reserve(n);
    weights_.reserve(n);
    for (std::size_t const i : order) {
      values_.push_back(view.values[i]);
      weights_.push_back(view.weights[i]);
      if (!view.counts.empty()) counts_.push_back(view.counts[i]);
      if (!view.groups.empty()) groups_.push_back(view.groups[i]);
    }
    cell_sums running;
    for (std::size_t i = 0; i < n; ++i) {
      if (i % stride == 0) marks_.push_back(running);
      running.add(count(i), weights_[i]);
    }
    all_ = running;
  }

  [[nodiscard]] std::size_t size() const noexcept { return values_.size(); }
  [[nodiscard]] double value(std::size_t i) const noexcept { return values_[i]; }
  [[nodiscard]] run_facts const& facts() const noexcept { return facts_; }

  /// Position of inf{x : F(x) >= p}; rounding in the sums is allowed for.
  [[nodiscard]] std::size_t position(double p) const noexcept {
    double const wanted = p * all_.weight * (1.0 - 8.0 * std::numeric_limits<double>::epsilon());
    auto const mark = std::partition_point(marks_.begin() + 1, marks_.end(),
                                           [&](cell_sums const& each) { return each.weight < wanted; });
    std::size_t i = static_cast<std::size_t>(mark - marks_.begin() - 1) * stride;
    double sum = marks_[i / stride].weight;
    for (; i + 1 < size(); ++i)
      if ((sum += count(i) * weights_[i]) >= wanted) break;
    return i;
  }
  /// How many entries are at most, or are less than, the one at this position.
  [[nodiscard]] std::size_t up_to(std::size_t i) const noexcept {
    return static_cast<std::size_t>(std::upper_bound(values_.begin(), values_.end(), values_[i]) - values_.begin());
  }
  [[nodiscard]] std::size_t before(std::size_t i) const noexcept {
    return static_cast<std::size_t>(std::lower_bound(values_.begin(), values_.end(), values_[i]) - values_.begin());
  }

  /// Share of the weight in the first n entries.
  [[nodiscard]] double share(std::size_t n) const noexcept { return first(n).weight / all_.weight; }

  /// The share of the first n entries with what carries its error.
  [[nodiscard]] estimate share_of_first(std::size_t n) const {
    cell_sums const in = first(n), out = rest(n);
    return estimate(in.weight / all_.weight, terms(n, in, out), facts_);
  }
  /// The same as a probability: on the logit scale, one-sided where it is none or all of them.
  [[nodiscard]] estimate probability_of_first(std::size_t n) const {
    cell_sums const in = first(n), out = rest(n);
    return share_estimate(in.weight, out.weight, terms(n, in, out), in.weight > 0.0, n < size(), facts_);
  }

 private:
  static constexpr std::size_t stride = 256;

  [[nodiscard]] double count(std::size_t i) const noexcept {
    return counts_.empty() ? 1.0 : static_cast<double>(counts_[i]);
  }
  [[nodiscard]] cell_sums first(std::size_t n) const noexcept {
    if (n == size()) return all_;
    cell_sums sums = marks_[n / stride];
    for (std::size_t i = n / stride * stride; i < n; ++i) sums.add(count(i), weights_[i]);
    return sums;
  }
  /// The sums of all entries past the first n: what little there is at an end is added up afresh.
  [[nodiscard]] cell_sums rest(std::size_t n) const noexcept {
    cell_sums sums;
    if (size() - n <= 8 * stride || n == 0) {
      for (std::size_t i = n; i < size(); ++i) sums.add(count(i), weights_[i]);
      return sums;
    }
    cell_sums const in = first(n);
    sums.weight = all_.weight - in.weight;
    sums.second = all_.second - in.second;
    sums.fourth = all_.fourth - in.fourth;
    return sums;
  }
  [[nodiscard]] error_terms terms(std::size_t n, cell_sums const& in, cell_sums const& out) const {
    if (groups_.empty()) return share_terms(in, out);
    std::vector<double> u(static_cast<std::size_t>(*std::max_element(groups_.begin(), groups_.end())) + 1);
    double const p = in.weight / all_.weight;
    for (std::size_t i = 0; i < size(); ++i) u[groups_[i]] += count(i) * weights_[i] * ((i < n ? 1.0 : 0.0) - p);
    error_terms result;
    for (double const sum : u) {
      double const square = (sum / all_.weight) * (sum / all_.weight);
      result.sum_squares += square;
      result.sum_fourth += square * square;
      result.largest_square = std::max(result.largest_square, square);
    }
    return result;
  }

  run_facts facts_;
  std::vector<double> values_, weights_;
  std::vector<std::uint64_t> counts_;
  std::vector<std::uint32_t> groups_;
  std::vector<cell_sums> marks_;
  cell_sums all_;
};

}  // namespace steelyard::inline v1::detail
