// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <iosfwd>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/mode_result.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// A weighted histogram: shares of the whole sample, so that the bins, the mass
/// below, above and at NaN add up to one, and the density integrates to the
/// share inside.
class histogram_result {
 public:
  histogram_result(bins edges, std::vector<detail::cell_sums> cells, detail::grouped_cells const& groups,
                   run_facts const& facts)
      : edges_(std::move(edges)), mode_(edges_, cells, groups, facts), groups_(groups), facts_(facts) {
    std::size_t const n = cells.size();
    cells.resize(edges_.size() + 3);
    detail::cell_sums inside;
    for (std::size_t b = 0; b < edges_.size(); ++b) inside += cells[b];
    std::vector<detail::cell_sums> const rest = others(cells, cells.size()), rest_inside = others(cells, edges_.size());
    auto const all = [](std::uint32_t) { return true; };
    auto const in_range = [this](std::uint32_t cell) { return cell < edges_.size(); };
    for (std::size_t b = 0; b < cells.size(); ++b) {
      auto const here = [b](std::uint32_t cell) { return cell == b; };
      error_terms const terms = facts.groups > 0.0 && n > 0 ? groups.terms(here, all) : detail::share_terms(cells[b], rest[b]);
      shares_.push_back(detail::share_estimate(cells[b].weight, rest[b].weight, terms, cells[b].weight > 0.0,
                                               rest[b].weight > 0.0, facts));
      if (b >= edges_.size()) continue;
      error_terms const within =
          facts.groups > 0.0 && n > 0 ? groups.terms(here, in_range) : detail::share_terms(cells[b], rest_inside[b]);
      inside_.push_back(detail::share_estimate(cells[b].weight, rest_inside[b].weight, within, cells[b].weight > 0.0,
                                               rest_inside[b].weight > 0.0, facts));
    }
    cells_ = std::move(cells);
  }

  [[nodiscard]] std::size_t size() const noexcept { return edges_.size(); }
  [[nodiscard]] double edge(std::size_t i) const noexcept { return edges_.edge(i); }
  /// Where the edges came from.
  [[nodiscard]] edge_choice edges_chosen() const noexcept { return edges_.chosen(); }

  /// Probability of bin b, as a share of the whole sample.
  [[nodiscard]] estimate const& probability(std::size_t b) const { return shares_.at(checked(b)); }
  /// Probability of bins first, first + 1, ..., last - 1 together. Its error bar is its own: what one bin has too much of,
  /// another has too little of.
  /// @throws bad_argument unless first < last <= size()
  estimate probability(std::size_t first, std::size_t last) const {
    if (first >= last || last > size())
      throw bad_argument("histogram: bins " + std::to_string(first) + " up to " + std::to_string(last) +
                         " were asked for together; a range has at least one bin and ends by " + std::to_string(size()));
    detail::cell_sums in, out;
    for (std::size_t b = 0; b < cells_.size(); ++b) (first <= b && b < last ? in : out) += cells_[b];
    auto const chosen = [=](std::uint32_t cell) { return first <= cell && cell < last; };
    error_terms const terms = groups_.empty() ? detail::share_terms(in, out)
                                              : groups_.terms(chosen, [](std::uint32_t) { return true; });
    return detail::share_estimate(in.weight, out.weight, terms, in.weight > 0.0, out.weight > 0.0, facts_);
  }
  /// Probability of bin b given that the readout lies within the edges.
  [[nodiscard]] estimate const& probability_inside(std::size_t b) const { return inside_.at(checked(b)); }
  /// Probability density in bin b: its probability over its width, per unit of the readout.
  [[nodiscard]] estimate density(std::size_t b) const { return probability(b).scaled(1.0 / edges_.width(b)); }
  /// The bin of highest density, and those that cannot be told from it.
  [[nodiscard]] mode_result const& mode() const noexcept { return mode_; }
  [[nodiscard]] estimate const& below() const noexcept { return shares_[size()]; }
  [[nodiscard]] estimate const& above() const noexcept { return shares_[size() + 1]; }
  [[nodiscard]] estimate const& not_a_number() const noexcept { return shares_[size() + 2]; }

 private:
  [[nodiscard]] std::size_t checked(std::size_t b) const {
    if (b >= size())
      throw bad_argument("histogram: there is no bin " + std::to_string(b) + " among " + std::to_string(size()));
    return b;
  }
  /// For each of the first n cells the sum of the other ones, without a difference.
  static std::vector<detail::cell_sums> others(std::vector<detail::cell_sums> const& cells, std::size_t n) {
    std::vector<detail::cell_sums> rest(n);
    detail::cell_sums before, after;
    for (std::size_t b = 0; b < n; ++b) {
      rest[b] += before;
      before += cells[b];
    }
    for (std::size_t b = n; b-- > 0;) {
      rest[b] += after;
      after += cells[b];
    }
    return rest;
  }

  bins edges_;
  mode_result mode_;
  std::vector<estimate> shares_;
  std::vector<estimate> inside_;
  std::vector<detail::cell_sums> cells_;
  detail::grouped_cells groups_;
  run_facts facts_;
};

/// One line a bin: its edges and its probability with the standard error.
[[nodiscard]] inline std::string to_string(histogram_result const& h) {
  std::string text;
  for (std::size_t b = 0; b < h.size(); ++b)
    text += "from " + detail::short_number(h.edge(b)) + " to " + detail::short_number(h.edge(b + 1)) + ": " +
            detail::rounded_to_error(h.probability(b).value, h.probability(b).standard_error) + "\n";
  text += "outside: " + detail::short_number(h.below().value) + " below, " + detail::short_number(h.above().value) +
          " above, " + detail::short_number(h.not_a_number().value) + " not a number";
  if (h.edges_chosen() == edge_choice::range) text += "\nThe quartiles coincide: the edges follow the range.";
  if (h.edges_chosen() == edge_choice::point) text += "\nThe edges follow the one value that was seen first.";
  return text;
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, histogram_result const& h) {
  return out << to_string(h).c_str();
}

}  // namespace steelyard::inline v1
