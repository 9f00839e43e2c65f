// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/quantile.hpp>

namespace steelyard::inline v1 {

/// The shortest interval that holds a share of the weight: ends and width are
/// estimates.
/// The ends settle only as n^(-1/3), and faster where the density stops short, which the sample does not tell: their
/// errors are upper ones and their verdict is `strained` at best. The width settles as n^(-1/2), and comes out a
/// little too small; its error counts that in.
struct shortest_interval_result {
  estimate lower;
  estimate upper;
  estimate width;

  operator interval() const noexcept { return {lower.value, upper.value, true, true}; }  // NOLINT: implicit on purpose
};

namespace detail {

/// Lowers the verdict of an estimate.
struct doubtful : estimate {
  doubtful(estimate const& e, steelyard::verdict at_best) : estimate(e) { lower_verdict(at_best); }
};

/// Ends of the shortest run of sorted values that has the wanted share of the
/// weight; of equally short ones the heaviest, then the lowest. Weights are added as whole numbers, so that
/// taking one away again leaves no rounding behind.
inline std::pair<double, double> shortest_run(std::span<double const> values, std::span<double const> weights,
                                              double level) {
  double total = 0.0;
  for (double const w : weights) total += w;
  std::vector<double> distinct;
  std::vector<std::uint64_t> shares;
  std::uint64_t all = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    auto const share = static_cast<std::uint64_t>(weights[i] / total * 0x1p62);
    all += share;
    if (!distinct.empty() && distinct.back() == values[i]) {
      shares.back() += share;
    } else {
      distinct.push_back(values[i]);
      shares.push_back(share);
    }
  }
  std::uint64_t const rounding = values.size();
  double const part = level * (1.0 - 8.0 * std::numeric_limits<double>::epsilon());
  auto wanted = static_cast<std::uint64_t>(part * static_cast<double>(all));
  wanted = wanted > rounding ? wanted - rounding : 1;
  std::pair<double, double> best{distinct.front(), distinct.back()};
  double width = distinct.back() - distinct.front();
  std::uint64_t most = all, held = 0;
  for (std::size_t from = 0, to = 0; from < distinct.size(); held -= shares[from++]) {
    while (to < distinct.size() && held < wanted) held += shares[to++];
    if (held < wanted) break;
    double const here = distinct[to - 1] - distinct[from];
    if (here < width || (here == width && held > most + rounding)) {
      best = {distinct[from], distinct[to - 1]};
      width = here;
      most = held;
    }
  }
  return best;
}

}  // namespace detail

/// Shortest coverage interval of a scalar readout on a kept sample.
///   errors from the intervals of G = 16 parts of the sample, or as many as it has groups: the parts' mean square
///   distance from the whole times G^(-2/3) for the ends, 1/G for the width   [Politis & Romano, Ann. Stat. 22, 1994]
/// Memory: 32 bytes an entry of positive weight. Cost  one sort and two walks.
template <class Readout>
class shortest_interval_estimator : public detail::column_estimator<Readout> {
 public:
  shortest_interval_estimator(Readout its_readout, double level)
      : detail::column_estimator<Readout>(std::move(its_readout)),
        level_(detail::checked_level("shortest_interval", level)) {}

  [[nodiscard]] shortest_interval_estimator fresh() const { return {this->readout(), level_}; }

  [[nodiscard]] shortest_interval_result answer(run_facts const& facts) const {
    weighted_view const all = this->view();
    std::size_t const n = all.weights.size();
    std::vector<std::size_t> order(n);
    for (std::size_t i = 0; i < n; ++i) order[i] = i;
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return all.values[a] < all.values[b]; });
    std::size_t const parts =
        facts.groups > 0.0 ? std::min(most_parts, static_cast<std::size_t>(facts.groups)) : most_parts;
    std::vector<double> values[most_parts + 1], weights[most_parts + 1];  // the last is the whole
    std::vector<std::uint64_t> before(all.counts.empty() ? 0 : n, 0);     // copies of earlier entries
    for (std::size_t i = 1; i < before.size(); ++i) before[i] = before[i - 1] + all.counts[i - 1];
    auto const put = [&](std::size_t part, std::size_t i, double times) {
      values[part].push_back(all.values[i]);
      weights[part].push_back(times * all.weights[i]);
    };
    for (std::size_t const i : order) {
      put(most_parts, i, all.count(i));
      if (!all.groups.empty() || before.empty()) {
        put(all.groups.empty() ? i / jackknife_run % parts : all.groups[i] % parts, i, all.count(i));
        continue;
      }
      for (std::size_t part = 0; part < parts; ++part)
        if (double const times = copies_in(part, before[i] + all.counts[i], parts) - copies_in(part, before[i], parts);
            times > 0.0)
          put(part, i, times);
    }
    auto const [lower, upper] = detail::shortest_run(values[most_parts], weights[most_parts], level_);
    error_terms of_lower, of_upper, of_width;
    double const g = static_cast<double>(parts), ends = std::pow(g, -1.0 / 3.0) / std::sqrt(g), across = 1.0 / g;
    auto const take = [](error_terms& terms, double u) {
      terms.sum_squares += u * u;
      terms.sum_fourth += (u * u) * (u * u);
      terms.largest_square = std::max(terms.largest_square, u * u);
    };
    for (std::size_t part = 0; part < parts; ++part) {
      if (values[part].empty()) continue;
      auto const [low, high] = detail::shortest_run(values[part], weights[part], level_);
      take(of_lower, ends * (low - lower));
      take(of_upper, ends * (high - upper));
      take(of_width, across * ((high - low) - (upper - lower)));
    }
    run_facts of_parts = facts;
    of_parts.groups = g;
    of_parts.how = how_drawn::labelled;
    of_parts.group_share_squares = 0.0;
    double const beyond = facts.effective_size() * std::min(level_, 1.0 - level_);
    verdict const at_best = beyond >= 100.0 ? verdict::sound : verdict::strained;
    auto const made = [&](double value, error_terms const& terms, verdict most) -> estimate {
      return detail::doubtful(estimate(value, terms, of_parts), most);
    };
    return {made(lower, of_lower, verdict::strained), made(upper, of_upper, verdict::strained),
            made(upper - lower, of_width, at_best)};
  }

 private:
  static constexpr std::size_t most_parts = 16;
  static constexpr std::uint64_t jackknife_run = 16;

  /// How many of the first n copies belong to a part: runs of 16 in turn.
  static double copies_in(std::size_t part, std::uint64_t n, std::size_t parts) {
    std::uint64_t const cycle = parts * jackknife_run, rest = n % cycle, start = part * jackknife_run;
    std::uint64_t const last = rest <= start ? 0 : std::min(rest - start, jackknife_run);
    return static_cast<double>(n / cycle * jackknife_run + last);
  }

  double level_;
};

/// The shortest interval that holds this share of a readout. @throws bad_argument unless 0 < level < 1.
template <class Readout>
[[nodiscard]] auto shortest_interval(Readout readout, double level) {
  return shortest_interval_estimator<Readout>(std::move(readout), level);
}

}  // namespace steelyard::inline v1
