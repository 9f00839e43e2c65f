// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
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
/// @param weighted  value and weight of place i = 0 .. n - 1
template <class Weighted>
std::pair<double, double> shortest_run(std::size_t n, Weighted weighted, double level) {
  double total = 0.0;
  for (std::size_t i = 0; i < n; ++i) total += weighted(i).second;
  std::vector<double> distinct;
  std::vector<std::uint64_t> shares;
  std::uint64_t all = 0;
  distinct.reserve(n);
  shares.reserve(n);
  for (std::size_t i = 0; i < n; ++i) {
    std::pair<double, double> const each = weighted(i);
    auto const share = static_cast<std::uint64_t>(each.second / total * 0x1p62);
    all += share;
    if (!distinct.empty() && distinct.back() == each.first) {
      shares.back() += share;
    } else {
      distinct.push_back(each.first);
      shares.push_back(share);
    }
  }
  std::uint64_t const rounding = n;
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
/// Memory: 72 bytes an entry of positive weight while it is worked out, none after. Cost  one sort and two walks.
template <class Readout>
class shortest_interval_estimator : public detail::column_estimator<Readout> {
 public:
  shortest_interval_estimator(Readout its_readout, double level)
      : detail::column_estimator<Readout>(std::move(its_readout)),
        level_(detail::checked_level("shortest_interval", level)) {}

  [[nodiscard]] shortest_interval_estimator fresh() const { return {this->readout(), level_}; }

  [[nodiscard]] shortest_interval_result answer(run_facts const& facts) const { return answer_from(this->parts(), facts); }
  [[nodiscard]] shortest_interval_result answer_from(detail::column_parts const& all, run_facts const& facts) const {
    struct placed {
      double value, weight;
      std::size_t place;
    };
    std::vector<placed> sorted;
    std::vector<std::uint64_t> counts, before;  // before: copies of earlier entries
    std::vector<std::uint32_t> groups;
    sorted.reserve(all.size());
    for (auto const& each : all) {
      for (std::size_t i = 0; i < each.size; ++i) sorted.push_back({each.values[i], each.weight(i), sorted.size()});
      if (each.counts != nullptr) counts.insert(counts.end(), each.counts, each.counts + each.size);
      if (each.groups != nullptr) groups.insert(groups.end(), each.groups, each.groups + each.size);
    }
    std::sort(sorted.begin(), sorted.end(), [](placed const& a, placed const& b) {
      return a.value < b.value || (!(b.value < a.value) && a.place < b.place);
    });
    std::size_t const parts =
        facts.groups > 0.0 ? std::min(most_parts, static_cast<std::size_t>(facts.groups)) : most_parts;
    before.resize(counts.size());
    for (std::size_t i = 1; i < before.size(); ++i) before[i] = before[i - 1] + counts[i - 1];
    auto const count = [&](std::size_t i) { return counts.empty() ? 1.0 : static_cast<double>(counts[i]); };
    std::vector<std::pair<double, double>> of_part[most_parts];
    for (auto& each : of_part) each.reserve(all.size() / parts + 1);
    for (placed const& each : sorted) {
      std::size_t const i = each.place;
      if (!groups.empty() || counts.empty()) {
        of_part[groups.empty() ? i / jackknife_run % parts : groups[i] % parts].emplace_back(each.value, count(i) * each.weight);
        continue;
      }
      for (std::size_t part = 0; part < parts; ++part)
        if (double const times = copies_in(part, before[i] + counts[i], parts) - copies_in(part, before[i], parts); times > 0.0)
          of_part[part].emplace_back(each.value, times * each.weight);
    }
    auto const [lower, upper] = detail::shortest_run(
        sorted.size(),
        [&](std::size_t i) { return std::pair(sorted[i].value, count(sorted[i].place) * sorted[i].weight); }, level_);
    error_terms of_lower, of_upper, of_width;
    double const g = static_cast<double>(parts), ends = std::pow(g, -1.0 / 3.0) / std::sqrt(g), across = 1.0 / g;
    auto const take = [](error_terms& terms, double u) {
      terms.sum_squares += u * u;
      terms.sum_fourth += (u * u) * (u * u);
      terms.largest_square = std::max(terms.largest_square, u * u);
    };
    for (std::size_t part = 0; part < parts; ++part) {
      if (of_part[part].empty()) continue;
      auto const [low, high] =
          detail::shortest_run(of_part[part].size(), [&](std::size_t i) { return of_part[part][i]; }, level_);
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
