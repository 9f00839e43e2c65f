// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/draw/words.hpp>
#include <steelyard/estimate/accumulation.hpp>
#include <steelyard/estimate/diagnosis.hpp>
#include <steelyard/estimate/run_facts.hpp>
#include <steelyard/weigh/together.hpp>
#include <steelyard/estimate/tail_index.hpp>

namespace steelyard::inline v1 {

/// What a run keeps of each sample.
enum class keeping {
  states,   ///< the states themselves
  streams,  ///< their stream numbers: states are made again when looked at
};

/// What a run does with a sampler that throws or returns no state.
enum class failures {
  stop,       ///< an error that names the lowest such sample
  set_aside,  ///< weight zero, counted, named in the diagnosis
};

namespace detail {

/// How the samples of a weighted sample came about, and what no reweighing changes.
struct sample_origin {
  bool from_run = false;  ///< drawn by a pipeline, and so to be extended by it
  std::uint64_t seed = 0;
  words source;
  failures on_failure = failures::stop;
  how_drawn how = how_drawn::independent;
  executor execute;

  std::uint64_t drawn = 0;   ///< counts and failed runs included
  std::uint64_t failed = 0;
  std::uint64_t calls = 0;   ///< of the sampler, spot checks included
  std::vector<std::uint64_t> samples;  ///< stream of each state; empty: position and stream are the same
  std::vector<std::uint64_t> counts;   ///< empty: one each
  std::vector<std::uint64_t> copies_before;  ///< sum of the counts before each block; empty where counts are
  std::vector<std::uint32_t> groups;   ///< rank of each state's label, from 0; empty: every sample on its own
  std::vector<double> group_shares;    ///< share of the samples in each group
  std::shared_ptr<base_influence const> influence;  ///< of the log-evidence found by a tempered run, by lineage
  std::vector<finding> findings;       ///< what the run itself had to say

  [[nodiscard]] std::uint64_t sample_of(std::size_t i) const noexcept { return samples.empty() ? i : samples[i]; }

  /// Positions of the states that belong to block b, of `size` states in all.
  [[nodiscard]] std::pair<std::size_t, std::size_t> range_of(std::uint64_t b, std::size_t size) const {
    std::uint64_t const first = b * block_size, last = first + block_size;
    if (samples.empty())
      return {static_cast<std::size_t>(std::min<std::uint64_t>(first, size)),
              static_cast<std::size_t>(std::min<std::uint64_t>(last, size))};
    auto const at = [&](std::uint64_t sample) {
      return static_cast<std::size_t>(std::lower_bound(samples.begin(), samples.end(), sample) - samples.begin());
    };
    return {at(first), at(last)};
  }
  [[nodiscard]] std::uint64_t blocks(std::size_t size) const noexcept {
    std::uint64_t const end = samples.empty() ? size : samples.back() + 1;
    return (end + block_size - 1) / block_size;
  }

  /// Takes in how many samples each state stands for.
  void take_counts(std::vector<std::uint64_t> its_counts) {
    counts = std::move(its_counts);
    drawn = 0;
    for (std::size_t i = 0; i < counts.size(); ++i) {
      if (i % block_size == 0) copies_before.push_back(drawn);
      drawn += counts[i];
    }
  }

  /// Replaces labels by their ranks and counts each group's share of the samples.
  void take_labels(std::span<std::uint32_t const> labels) {
    if (labels.empty()) return;
    std::vector<std::uint32_t> distinct(labels.begin(), labels.end());
    std::sort(distinct.begin(), distinct.end());
    distinct.erase(std::unique(distinct.begin(), distinct.end()), distinct.end());
    group_shares.assign(distinct.size(), 0.0);
    groups.clear();
    groups.reserve(labels.size());
    double total = 0.0;
    for (std::size_t i = 0; i < labels.size(); ++i) {
      auto const rank = static_cast<std::size_t>(std::lower_bound(distinct.begin(), distinct.end(), labels[i]) - distinct.begin());
      double const m = counts.empty() ? 1.0 : static_cast<double>(counts[i]);
      groups.push_back(static_cast<std::uint32_t>(rank));
      group_shares[rank] += m;
      total += m;
    }
    for (double& share : group_shares) share /= total;
  }

  [[nodiscard]] group_facts grouping() const {
    group_facts facts;
    if (group_shares.empty()) {
      facts.jackknife_shares = independent_shares(drawn);
      return facts;
    }
    facts.jackknife_shares.assign(std::min(group_shares.size(), jackknife_groups), 0.0);
    for (std::size_t g = 0; g < group_shares.size(); ++g) facts.jackknife_shares[g % jackknife_groups] += group_shares[g];
    return facts;
  }
};

/// Whether the weights of a tempered sample lie so far from those it was moved under that their sums may have no
/// variance: they carry less than the half that the run itself allows a rung, or their tail is that heavy.
inline bool far_from_drawn(weight_totals const& totals, sample_origin const& origin) {
  if (origin.how != how_drawn::lineages) return false;
  double const some = totals.samples - totals.zeros;
  if (totals.effective_size() < 0.5 * some) return true;
  pareto_tail const tail = tail_of(totals.largest, some);
  return tail.known && tail.shape > 0.5;
}

/// Findings for what the readings in a weighter have to say against themselves.
template <class Weighter>
void note_doubts(sample_origin& origin, Weighter const& weighter) {
  std::vector<std::string> doubts;
  collect_doubts(weighter, doubts);
  for (std::string& each : doubts) origin.findings.push_back({finding_kind::reading_doubt, std::move(each)});
}

/// Facts for the answers, from what a run's weights added up to.
inline run_facts facts_of(weight_totals const& totals, sample_origin const& origin) {
  run_facts facts;
  facts.drawn = origin.drawn;
  facts.failed = origin.failed;
  facts.zeros = static_cast<std::uint64_t>(totals.zeros);
  facts.maximum = totals.maximum;
  facts.sum = totals.sum;
  facts.sum_squares = totals.squares;
  facts.how = origin.how;
  facts.groups = static_cast<double>(origin.group_shares.size());
  for (double const share : origin.group_shares) facts.group_share_squares += share * share;
  facts.largest_unit = facts.groups > 0.0 ? totals.largest_group() : totals.sum > 0.0 ? 1.0 / totals.sum : 0.0;
  facts.far_from_drawn = far_from_drawn(totals, origin);
  facts.influence = origin.influence;
  return facts;
}

inline diagnosis diagnosis_of(weight_totals const& totals, sample_origin const& origin, std::vector<finding> findings,
                              bool bounded) {
  diagnosis::numbers n;
  n.drawn = origin.drawn;
  n.failed = origin.failed;
  n.states = static_cast<std::uint64_t>(totals.samples);
  n.zeros = static_cast<std::uint64_t>(totals.zeros);
  n.effective_size = totals.effective_size();
  n.perplexity = totals.sum > 0.0 ? totals.sum * portable_exp(-totals.logs / totals.sum) : 0.0;
  n.largest_share = totals.sum > 0.0 ? 1.0 / totals.sum : 0.0;
  n.groups = static_cast<double>(origin.group_shares.size());
  pareto_tail const tail = tail_of(totals.largest, totals.samples - totals.zeros);
  n.tail_index = tail.shape;
  n.tail_error = tail.standard_error;
  n.tail_known = tail.known;
  n.bounded = bounded;
  if (origin.how == how_drawn::lineages) {
    double squares = 0.0;
    for (double const share : origin.group_shares) squares += share * share;
    n.lineages = 1.0 / squares;
    n.far_from_drawn = far_from_drawn(totals, origin);
  }
  return diagnosis(n, std::move(findings));
}

}  // namespace detail

}  // namespace steelyard::inline v1
