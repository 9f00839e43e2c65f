// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bin_lanes.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/error.hpp>
#include <steelyard/base/text.hpp>

namespace steelyard::inline v1 {

class bins;
namespace detail {
bins choose_bins(std::vector<std::pair<double, double>> pilot, double dimensions);
}

/// Where edges came from.
enum class edge_choice {
  given,   ///< by the caller
  spread,  ///< from the distance between the quartiles
  range,   ///< from the range, since the quartiles coincide
  point,   ///< one unit around the only value there is
};

/// The edges of a histogram: closed left, open right, the last bin closed on
/// both sides. Cells 0 to size() - 1 are the bins; then come below, above, NaN.
class bins {
 public:
  /// Given edges, rising strictly. @throws bad_argument where they do not, or fewer than two.
  explicit bins(std::vector<double> edges) : bins(std::move(edges), 0.0) {}

  [[nodiscard]] std::size_t size() const noexcept { return edges_->size() - 1; }
  [[nodiscard]] double edge(std::size_t i) const noexcept { return (*edges_)[i]; }
  [[nodiscard]] double width(std::size_t b) const noexcept { return (*edges_)[b + 1] - (*edges_)[b]; }
  [[nodiscard]] edge_choice chosen() const noexcept { return chosen_; }

  /// The cell of a value: even edges by one product and a step, others by bisection.
  [[nodiscard]] std::size_t cell(double x) const noexcept {
    std::vector<double> const& e = *edges_;
    std::size_t const n = e.size() - 1;
    if (detail::is_nan(x)) return n + 2;
    if (x < e.front()) return n;
    if (x >= e.back()) return x == e.back() ? n - 1 : n + 1;
    if (per_width_ > 0.0) {
      std::size_t b = std::min(n - 1, static_cast<std::size_t>((x - e.front()) * per_width_));
      while (x < e[b]) --b;
      while (x >= e[b + 1]) ++b;
      return b;
    }
    return static_cast<std::size_t>(std::upper_bound(e.begin(), e.end(), x) - e.begin()) - 1;
  }
  /// The cells of many values. @pre out has room for as many
  /// Cost  0.4 ns a value for even edges, with 512-bit vectors.
  void cells(std::span<double const> values, std::uint64_t* out) const noexcept {
    if (!(slack_ < 0.25)) {
      for (std::size_t i = 0; i < values.size(); ++i) out[i] = cell(values[i]);
      return;
    }
    if (!detail::place_all(values, {edges_->front(), per_width_, static_cast<double>(size()), slack_}, out)) return;
    for (std::size_t i = 0; i < values.size(); ++i)
      if (out[i] == detail::unplaced) out[i] = cell(values[i]);
  }

 private:
  friend bins equal_bins(double, double, std::size_t);
  friend bins detail::choose_bins(std::vector<std::pair<double, double>>, double);

  bins(std::vector<double> edges, double per_width) : per_width_(per_width) {
    if (edges.size() < 2) throw bad_argument("histogram: a histogram needs at least two edges");
    for (std::size_t i = 0; i < edges.size(); ++i)
      if (!detail::is_finite(edges[i]) || (i > 0 && !(edges[i - 1] < edges[i])))
        throw bad_argument("histogram: edge " + std::to_string(i) + " is " + detail::plain_number(edges[i]) +
                           "; edges must be finite and rise strictly");
    edges_ = std::make_shared<std::vector<double> const>(std::move(edges));
    if (per_width_ > 0.0) {  // how far (x - lower) / width and the edges' own places may be off, in widths
      double const largest = std::max(std::abs(edges_->front()), std::abs(edges_->back()));
      slack_ = 0x1p-50 * (largest * per_width_ + static_cast<double>(size()));
    }
  }

  std::shared_ptr<std::vector<double> const> edges_;
  double per_width_ = 0.0;
  double slack_ = 1.0;
  edge_choice chosen_ = edge_choice::given;
};

/// n bins of equal width. @throws bad_argument unless lower < upper, both finite, and n >= 1.
[[nodiscard]] inline bins equal_bins(double lower, double upper, std::size_t n) {
  if (!detail::is_finite(lower) || !detail::is_finite(upper) || !(lower < upper) || n == 0)
    throw bad_argument("equal_bins: lower " + detail::plain_number(lower) + ", upper " + detail::plain_number(upper) +
                       ", " + std::to_string(n) + " bins; lower must lie below upper and there must be a bin");
  std::vector<double> edges(n + 1);
  double const span = upper - lower;
  for (std::size_t i = 0; i <= n; ++i) edges[i] = lower + span * (static_cast<double>(i) / static_cast<double>(n));
  edges[n] = upper;
  double const per_width = static_cast<double>(n) / span;
  return bins(std::move(edges), detail::is_finite(per_width) ? per_width : 0.0);  // infinite where widths are subnormal
}

/// n bins of equal width on a logarithmic scale. @throws bad_argument unless 0 < lower < upper, both finite, and n >= 1.
[[nodiscard]] inline bins log_bins(double lower, double upper, std::size_t n) {
  if (!detail::is_finite(lower) || !detail::is_finite(upper) || !(lower > 0.0) || !(lower < upper) || n == 0)
    throw bad_argument("log_bins: lower " + detail::plain_number(lower) + ", upper " + detail::plain_number(upper) +
                       ", " + std::to_string(n) + " bins; it needs 0 < lower < upper and a bin");
  std::vector<double> edges(n + 1);
  double const ratio = std::log(upper / lower);
  for (std::size_t i = 0; i <= n; ++i)
    edges[i] = lower * std::exp(ratio * (static_cast<double>(i) / static_cast<double>(n)));
  edges[0] = lower;
  edges[n] = upper;
  return bins(std::move(edges));
}

/// Edges that the first 4096 entries of positive weight choose: see `automatic_bins`.
struct automatic_bins_t {};
/// Automatic edges: width 2 IQR n^(-1/3), n the effective size of those entries, from their quantile 0.001 to 0.999,
/// 5 to 200 bins. Where the quartiles coincide, the range takes their place, as wide against them as in a normal law;
/// where those two quantiles do, all entries make the range; where all values do, it is a unit around them.
/// In two dimensions the power is -1/4. The result records the edges and how they were chosen.
///   [Freedman & Diaconis, Z. Wahrscheinlichkeitstheorie 57, 1981, 453; Scott, Multivariate Density Estimation, 1992, ch. 3]
inline constexpr automatic_bins_t automatic_bins{};

namespace detail {

template <class Edges>
inline constexpr bool are_edges_v = std::is_convertible_v<Edges, bins> || std::is_same_v<Edges, automatic_bins_t>;

}  // namespace detail

namespace detail {

/// Chooses automatic edges from a weighted pilot, for a histogram in so many dimensions.
inline bins choose_bins(std::vector<std::pair<double, double>> pilot, double dimensions) {
  std::erase_if(pilot, [](auto const& each) { return !is_finite(each.first); });
  auto const recorded = [](bins edges, edge_choice how) {
    edges.chosen_ = how;
    return edges;
  };
  if (pilot.empty()) return recorded(equal_bins(-0.5, 0.5, 1), edge_choice::point);
  std::stable_sort(pilot.begin(), pilot.end(), [](auto const& a, auto const& b) { return a.first < b.first; });
  double total = 0.0, squares = 0.0;
  for (auto const& [x, w] : pilot) {
    total += w;
    squares += w * w;
  }
  auto const at = [&](double p) {
    double sum = 0.0;
    for (auto const& [x, w] : pilot)
      if ((sum += w) >= p * total) return x;
    return pilot.back().first;
  };
  double lower = at(0.001), upper = at(0.999), spread = at(0.75) - at(0.25);
  edge_choice const how = spread > 0.0 ? edge_choice::spread : edge_choice::range;
  if (!(lower < upper)) {
    lower = pilot.front().first;
    upper = pilot.back().first;
  }
  if (!(lower < upper)) {
    double const half = std::max(0.5, std::abs(lower) * 1e-3);
    return recorded(equal_bins(lower - half, upper + half, 5), edge_choice::point);
  }
  constexpr double quartiles_in_range = 1.3489795 / 6.1804646;  // of a normal law, from quantile 0.001 to 0.999
  if (how == edge_choice::range) spread = (upper - lower) * quartiles_in_range;
  double const n = std::ceil((upper - lower) / (2.0 * spread) * std::pow(total * (total / squares), 1.0 / (2.0 + dimensions)));
  return recorded(equal_bins(lower, upper, static_cast<std::size_t>(std::clamp(n, 5.0, 200.0))), how);
}

}  // namespace detail

}  // namespace steelyard::inline v1
