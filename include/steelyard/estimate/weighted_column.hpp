// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <limits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/student.hpp>
#include <steelyard/estimate/column_buckets.hpp>
#include <steelyard/estimate/column_parts.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1::detail {

/// One value with its weight, and where they are needed its count and group.
struct plain_entry {
  double value, weight;
  static plain_entry of(column_parts::part const& part, std::size_t i) noexcept { return {part.values[i], part.weight(i)}; }
  [[nodiscard]] static constexpr double copies() noexcept { return 1.0; }
};
struct counted_entry {
  static constexpr bool stays = true;  // sums over groups go through all entries
  double value, weight, count;
  std::uint32_t group;
  static counted_entry of(column_parts::part const& part, std::size_t i) noexcept {
    return {part.values[i], part.weight(i), part.count(i), part.groups == nullptr ? 0u : part.groups[i]};
  }
  [[nodiscard]] double copies() const noexcept { return count; }
};

/// The values of one readout in rising order with their weights: what a
/// quantile and its Woodruff limits are read from, at any level.
/// Memory: 17 bytes an entry; with counts or groups up to 29, and as many again of those that were looked into.
class weighted_column {
  template <class Act>
  decltype(auto) at(Act act) const {
    return counted_ ? act(rich_) : act(plain_);
  }

 public:
  weighted_column(column_parts parts, run_facts const& facts)
      : facts_(facts), grouped_(parts.grouped()), counted_(grouped_ || parts.counted()), groups_(groups_in(parts)),
        plain_(counted_ ? column_parts() : parts), rich_(counted_ ? std::move(parts) : column_parts()) {}

  [[nodiscard]] std::size_t size() const noexcept { return counted_ ? rich_.size() : plain_.size(); }
  [[nodiscard]] double value(std::size_t i) const {
    return at([&](auto const& column) { return column[i].value; });
  }
  [[nodiscard]] run_facts const& facts() const noexcept { return facts_; }

  /// Position of inf{x : F(x) >= p}; rounding in the sums is allowed for.
  [[nodiscard]] std::size_t position(double p) const {
    double const wanted = p * all().weight * (1.0 - 8.0 * std::numeric_limits<double>::epsilon());
    return at([&](auto const& column) { return column.reaching(wanted); });
  }
  /// How many entries are at most, or are less than, the one at this position.
  [[nodiscard]] std::size_t up_to(std::size_t i) const {
    return at([&](auto const& column) { return column.up_to(i); });
  }
  [[nodiscard]] std::size_t before(std::size_t i) const {
    return at([&](auto const& column) { return column.before(i); });
  }

  /// Sorts all entries at once: for those who will ask for most of them.
  void look_into_all() const {
    at([](auto const& column) { column.look_into_all(); });
  }

  /// Share of the weight in the first n entries.
  [[nodiscard]] double share(std::size_t n) const { return first(n).weight / all().weight; }

  /// The share of the first n entries with what carries its error.
  [[nodiscard]] estimate share_of_first(std::size_t n) const {
    cell_sums const in = first(n), out = rest(n);
    return estimate(in.weight / all().weight, terms(n, in, out), facts_);
  }
  /// The same as a probability: on the logit scale, one-sided where it is none or all of them.
  [[nodiscard]] estimate probability_of_first(std::size_t n) const {
    cell_sums const in = first(n), out = rest(n);
    return share_estimate(in.weight, out.weight, terms(n, in, out), in.weight > 0.0, n < size(), facts_);
  }

 private:
  static std::size_t groups_in(column_parts const& parts) noexcept {
    std::size_t groups = 0;
    if (parts.grouped())
      for (auto const& part : parts)
        for (std::size_t i = 0; i < part.size; ++i) groups = std::max(groups, std::size_t{part.groups[i]} + 1);
    return groups;
  }
  [[nodiscard]] cell_sums all() const noexcept { return counted_ ? rich_.all() : plain_.all(); }
  [[nodiscard]] cell_sums first(std::size_t n) const {
    return at([&](auto const& column) { return column.first(n); });
  }
  [[nodiscard]] cell_sums rest(std::size_t n) const {
    return at([&](auto const& column) { return column.rest(n); });
  }
  [[nodiscard]] error_terms terms(std::size_t n, cell_sums const& in, cell_sums const& out) const {
    if (!grouped_) return share_terms(in, out);
    std::vector<double> u(groups_);
    double const total = all().weight, p = in.weight / total;
    rich_.for_each(n, [&](counted_entry const& each, bool within) {
      u[each.group] += each.count * each.weight * ((within ? 1.0 : 0.0) - p);
    });
    error_terms result;
    for (double const sum : u) {
      double const square = (sum / total) * (sum / total);
      result.sum_squares += square;
      result.sum_fourth += square * square;
      result.largest_square = std::max(result.largest_square, square);
    }
    return result;
  }

  run_facts facts_;
  bool grouped_, counted_;
  std::size_t groups_;
  column_buckets<plain_entry> plain_;
  column_buckets<counted_entry> rich_;
};

}  // namespace steelyard::inline v1::detail
