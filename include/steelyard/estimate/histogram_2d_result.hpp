// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <iosfwd>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// A weighted histogram of two readouts: shares of the whole sample, so that
/// the cells and the mass outside add up to one, and the density integrates to the share inside.
class histogram_2d_result {
 public:
  /// @param cells  powers of the weights by cell, x-bin (y-bins + 3) + y-bin, see `bins::cell`
  histogram_2d_result(bins x, bins y, detail::group_sums<3> const& cells, detail::grouped_cells groups,
                      run_facts const& facts)
      : x_(std::move(x)), y_(std::move(y)), groups_(std::move(groups)), facts_(facts) {
    std::size_t const n = cells.size();
    for (std::size_t k = 0; k < n; ++k) {
      labels_.push_back(cells.label(k));
      detail::cell_sums& one = sums_.emplace_back();
      one.weight = cells[k][0];
      one.second = cells[k][1];
      one.fourth = cells[k][2];
    }
    rest_.resize(n);
    detail::cell_sums before, after;
    for (std::size_t k = 0; k < n; before += sums_[k++]) rest_[k] += before;
    for (std::size_t k = n; k-- > 0; after += sums_[k]) rest_[k] += after;
    if (facts.groups > 0.0) take_groups();
  }

  [[nodiscard]] std::size_t x_size() const noexcept { return x_.size(); }
  [[nodiscard]] std::size_t y_size() const noexcept { return y_.size(); }
  [[nodiscard]] double x_edge(std::size_t i) const noexcept { return x_.edge(i); }
  [[nodiscard]] double y_edge(std::size_t j) const noexcept { return y_.edge(j); }
  /// Where the edges came from.
  [[nodiscard]] edge_choice x_edges_chosen() const noexcept { return x_.chosen(); }
  [[nodiscard]] edge_choice y_edges_chosen() const noexcept { return y_.chosen(); }

  /// Probability of cell (i, j), as a share of the whole sample. @throws bad_argument past the end.
  estimate probability(std::size_t i, std::size_t j) const {
    if (i >= x_size() || j >= y_size())
      throw bad_argument("histogram_2d: there is no cell (" + std::to_string(i) + ", " + std::to_string(j) +
                         ") among " + std::to_string(x_size()) + " by " + std::to_string(y_size()));
    auto const wanted = static_cast<std::uint32_t>(i * (y_size() + 3) + j);
    auto const found = std::lower_bound(labels_.begin(), labels_.end(), wanted);
    if (found == labels_.end() || *found != wanted) return estimate::one_sided(false, facts_);
    auto const k = static_cast<std::size_t>(found - labels_.begin());
    return share(sums_[k], rest_[k], terms_.empty() ? detail::share_terms(sums_[k], rest_[k]) : terms_[k]);
  }
  /// Its probability over its area. @throws bad_argument past the end.
  estimate density(std::size_t i, std::size_t j) const {
    return probability(i, j).scaled(1.0 / (x_.width(i) * y_.width(j)));
  }

  /// Mass in no cell, whatever the reason, and by reason; one sample may have several.
  [[nodiscard]] estimate outside() const {
    return share_of([this](std::size_t i, std::size_t j) { return i >= x_size() || j >= y_size(); });
  }
  [[nodiscard]] estimate x_below() const {
    return share_of([this](std::size_t i, std::size_t) { return i == x_size(); });
  }
  [[nodiscard]] estimate x_above() const {
    return share_of([this](std::size_t i, std::size_t) { return i == x_size() + 1; });
  }
  [[nodiscard]] estimate y_below() const {
    return share_of([this](std::size_t, std::size_t j) { return j == y_size(); });
  }
  [[nodiscard]] estimate y_above() const {
    return share_of([this](std::size_t, std::size_t j) { return j == y_size() + 1; });
  }
  [[nodiscard]] estimate not_a_number() const {
    return share_of([this](std::size_t i, std::size_t j) { return i == x_size() + 2 || j == y_size() + 2; });
  }

 private:
  [[nodiscard]] estimate share(detail::cell_sums const& in, detail::cell_sums const& out,
                               error_terms const& terms) const {
    return detail::share_estimate(in.weight, out.weight, terms, in.weight > 0.0, out.weight > 0.0, facts_);
  }
  template <class Where>
  [[nodiscard]] estimate share_of(Where where) const {
    auto const chosen = [&](std::uint32_t label) { return where(label / (y_size() + 3), label % (y_size() + 3)); };
    detail::cell_sums in, out;
    for (std::size_t k = 0; k < labels_.size(); ++k) (chosen(labels_[k]) ? in : out) += sums_[k];
    return share(in, out, terms_.empty() ? detail::share_terms(in, out) : groups_.terms(chosen, [](std::uint32_t) {
      return true;
    }));
  }
  /// Terms of every cell from groups, in one walk: with p the cell's share and W_g the group's,
  ///   sum u^2 = sum over groups in the cell of (w - p W_g)^2, plus p^2 times the sum of W_g^2 over the others
  void take_groups() {
    terms_.resize(labels_.size());
    std::vector<double> seconds(labels_.size()), fourths(labels_.size());
    std::vector<std::pair<std::uint32_t, double>> of_group;
    double const total = sums_.empty() ? 0.0 : sums_[0].weight + rest_[0].weight;
    double second = 0.0, fourth = 0.0, largest = 0.0;
    auto const close = [&] {
      double whole = 0.0;
      for (auto const& [cell, w] : of_group) whole += w / total;
      double const square = whole * whole;
      for (auto const& [cell, w] : of_group) {
        auto const k =
            static_cast<std::size_t>(std::lower_bound(labels_.begin(), labels_.end(), cell) - labels_.begin());
        double const u = w / total - sums_[k].weight / total * whole;
        terms_[k].sum_squares += u * u;
        terms_[k].sum_fourth += (u * u) * (u * u);
        terms_[k].largest_square = std::max(terms_[k].largest_square, u * u);
        seconds[k] += square;
        fourths[k] += square * square;
      }
      second += square;
      fourth += square * square;
      largest = std::max(largest, square);
      of_group.clear();
    };
    std::uint32_t group = 0;
    groups_.for_each([&](std::uint32_t its_group, std::uint32_t cell, double w) {
      if (!of_group.empty() && its_group != group) close();
      group = its_group;
      of_group.emplace_back(cell, w);
    });
    close();
    for (std::size_t k = 0; k < labels_.size(); ++k) {
      double const p = sums_[k].weight / total, p2 = p * p;
      terms_[k].sum_squares += p2 * std::max(0.0, second - seconds[k]);
      terms_[k].sum_fourth += p2 * p2 * std::max(0.0, fourth - fourths[k]);
      if (seconds[k] < second) terms_[k].largest_square = std::max(terms_[k].largest_square, p2 * largest);
    }
  }

  bins x_, y_;
  std::vector<std::uint32_t> labels_;
  std::vector<detail::cell_sums> sums_, rest_;
  std::vector<error_terms> terms_;  // with groups only
  detail::grouped_cells groups_;
  run_facts facts_;
};

/// One line a cell that holds something: its edges and its probability with the standard error.
[[nodiscard]] inline std::string to_string(histogram_2d_result const& h) {
  std::string text;
  for (std::size_t i = 0; i < h.x_size(); ++i)
    for (std::size_t j = 0; j < h.y_size(); ++j) {
      estimate const p = h.probability(i, j);
      if (p.never_seen()) continue;
      text += "from " + detail::short_number(h.x_edge(i)) + " to " + detail::short_number(h.x_edge(i + 1)) +
              " and from " + detail::short_number(h.y_edge(j)) + " to " + detail::short_number(h.y_edge(j + 1)) + ": " +
              detail::rounded_to_error(p.value, p.standard_error) + "\n";
    }
  return text + "outside: " + detail::short_number(h.outside().value);
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, histogram_2d_result const& h) {
  return out << to_string(h).c_str();
}

}  // namespace steelyard::inline v1
