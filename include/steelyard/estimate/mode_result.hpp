// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <iosfwd>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>
#include <steelyard/estimate/bins.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/share_sums.hpp>

namespace steelyard::inline v1 {

/// Where the density of a histogram is highest: a bin, its density, and the bins that cannot be told from it.
/// Bins narrower than the sample can fill make any bin the highest: `rivals` says so.
class mode_result {
 public:
  mode_result(bins edges, std::vector<detail::cell_sums> cells, detail::grouped_cells const& groups,
              run_facts const& facts)
      : edges_(std::move(edges)) {
    std::size_t const n = edges_.size();
    cells.resize(n + 3);
    auto const height = [&](std::size_t b) { return cells[b].weight / edges_.width(b); };
    for (std::size_t b = 1; b < n; ++b)
      if (height(b) > height(bin_)) bin_ = b;
    detail::cell_sums rest;
    for (std::size_t b = 0; b < cells.size(); ++b)
      if (b != bin_) rest += cells[b];
    bool const grouped = facts.groups > 0.0;
    error_terms const of_bin =
        grouped ? groups.terms([this](std::uint32_t cell) { return cell == bin_; }, [](std::uint32_t) { return true; })
                : detail::share_terms(cells[bin_], rest);
    density_ = detail::share_estimate(cells[bin_].weight, rest.weight, of_bin, cells[bin_].weight > 0.0,
                                      rest.weight > 0.0, facts)
                   .scaled(1.0 / edges_.width(bin_));
    double const total = cells[bin_].weight + rest.weight, scale = total > 0.0 ? 1.0 / total : 0.0,
                 square = scale * scale;
    for (std::size_t b = 0; b < n; ++b) {
      if (b == bin_) continue;
      double const a = 1.0 / edges_.width(bin_), c = 1.0 / edges_.width(b), lead = (height(bin_) - height(b)) * scale;
      error_terms terms;
      if (grouped) {
        terms = between(groups, b, a, c, lead, scale);
      } else {
        detail::cell_sums others;
        others.second = std::max(0.0, rest.second - cells[b].second);
        others.fourth = std::max(0.0, rest.fourth - cells[b].fourth);
        add(terms, cells[bin_], (a - lead) * (a - lead), square);
        add(terms, cells[b], (c + lead) * (c + lead), square);
        add(terms, others, lead * lead, square);
      }
      leads_.push_back(estimate(lead, terms, facts));
    }
  }

  /// The bin of highest density; of equals the lowest.
  [[nodiscard]] std::size_t bin() const noexcept { return bin_; }
  /// The middle of that bin.
  [[nodiscard]] double value() const noexcept { return 0.5 * (lower() + upper()); }
  [[nodiscard]] double lower() const noexcept { return edges_.edge(bin_); }
  [[nodiscard]] double upper() const noexcept { return edges_.edge(bin_ + 1); }
  /// Probability density in that bin.
  [[nodiscard]] estimate const& density() const noexcept { return density_; }
  [[nodiscard]] steelyard::verdict verdict() const noexcept { return density_.verdict(); }

  /// Bins whose density may be the highest: those that fall short by no more than Monte Carlo error, tested one-sided
  /// and together at the level.                                                             [Bonferroni]
  /// @throws bad_argument for a level outside (0, 1).
  std::vector<std::size_t> rivals(double level) const {
    if (!detail::is_finite(level) || !(level > 0.0 && level < 1.0))
      throw bad_argument("rivals: the level " + detail::plain_number(level) + " is outside (0, 1)");
    double const each = 1.0 - 2.0 * (1.0 - level) / static_cast<double>(leads_.size());
    std::vector<std::size_t> close;
    for (std::size_t k = 0; k < leads_.size(); ++k) {
      interval const lead = each > 0.0 ? leads_[k].error_interval(each) : interval{leads_[k].value, 0.0, true, true};
      if (!lead.lower_known || lead.lower <= 0.0) close.push_back(k < bin_ ? k : k + 1);
    }
    return close;
  }

  /// From the lowest to the highest edge of the bin and its rivals.
  /// @throws bad_argument for a level outside (0, 1).
  interval error_interval(double level) const {
    std::size_t first = bin_, last = bin_;
    for (std::size_t const b : rivals(level)) {
      first = std::min(first, b);
      last = std::max(last, b);
    }
    return {edges_.edge(first), edges_.edge(last + 1), true, true};
  }

 private:
  static void add(error_terms& terms, detail::cell_sums const& cell, double u2, double square) noexcept {
    terms.sum_squares += cell.second * u2 * square;
    terms.sum_fourth += cell.fourth * (u2 * u2) * (square * square);
  }
  /// Terms of the lead from groups: u_g = W_g,bin a - W_g,b c - W_g lead.
  [[nodiscard]] error_terms between(detail::grouped_cells const& groups, std::size_t b, double a, double c, double lead,
                                    double scale) const {
    error_terms terms;
    double u = 0.0;
    bool any = false;
    std::uint32_t group = 0;
    auto const close = [&] {
      terms.sum_squares += u * u;
      terms.sum_fourth += (u * u) * (u * u);
      terms.largest_square = std::max(terms.largest_square, u * u);
      u = 0.0;
    };
    groups.for_each([&](std::uint32_t its_group, std::uint32_t cell, double weight) {
      if (any && its_group != group) close();
      any = true;
      group = its_group;
      u += weight * scale * ((cell == bin_ ? a : cell == b ? -c : 0.0) - lead);
    });
    close();
    return terms;
  }

  bins edges_;
  std::size_t bin_ = 0;
  estimate density_;
  std::vector<estimate> leads_;  // over each other bin, in order
};

[[nodiscard]] inline std::string to_string(mode_result const& m) {
  std::size_t const others = m.rivals(0.95).size();
  return "highest from " + detail::short_number(m.lower()) + " to " + detail::short_number(m.upper()) + ", density " +
         to_string(m.density()) +
         (others == 0 ? "" : "; " + std::to_string(others) + " more bins may be the highest at level 0.95");
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, mode_result const& m) {
  return out << to_string(m).c_str();
}

}  // namespace steelyard::inline v1
