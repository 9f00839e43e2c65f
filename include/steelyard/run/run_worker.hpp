// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <mutex>
#include <span>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/reader.hpp>
#include <steelyard/estimate/sweep.hpp>
#include <steelyard/run/maker.hpp>
#include <steelyard/sample/state_store.hpp>

namespace steelyard::inline v1::detail {

/// What the workers of one run share.
struct run_shared {
  run_terms terms;
  std::uint64_t size = 0;
  std::vector<std::uint64_t> probed;

  std::mutex mutex;
  std::uint64_t failed = 0;         ///< runs set aside
  std::vector<double> largest;      ///< log-likelihood of each reading
  std::vector<probe> probes;        ///< what the probed samples came to the first time

  /// Takes in what a worker's maker saw since `failed_before`.
  template <class Maker>
  void take(Maker const& maker, std::uint64_t failed_before) {
    std::lock_guard const lock(mutex);
    failed += maker.failed() - failed_before;
    largest.resize(maker.largest().size(), impossible);
    for (std::size_t k = 0; k < largest.size(); ++k) largest[k] = std::max(largest[k], maker.largest()[k]);
  }
  void keep(std::vector<probe> const& seen) {
    std::lock_guard const lock(mutex);
    probes.insert(probes.end(), seen.begin(), seen.end());
  }
};

/// Makes the samples of block `index` in turn and calls take(i, state&&, log_weight, scores) for each.
template <class Maker, class Take>
void make_block(Maker& maker, run_shared& shared, std::uint64_t index, Take take) {
  std::uint64_t const first = index * block_size, last = std::min<std::uint64_t>(first + block_size, shared.size);
  std::uint64_t const failed = maker.failed();
  maker.expect(first, last - first);
  std::vector<probe> seen;
  for (std::uint64_t i = first; i < last; ++i)
    maker.make(i, [&](auto&& state, double log_weight, std::span<double const> scores) {
      if (index == 0 && i < 64 && std::find(shared.probed.begin(), shared.probed.end(), i) != shared.probed.end())
        seen.push_back({i, maker.words_used(), opaque_bits(log_weight)});
      take(i, std::forward<decltype(state)>(state), log_weight, scores);
    });
  shared.take(maker, failed);
  if (!seen.empty()) shared.keep(seen);
}

/// Replays the probed samples out of step; the first that differs, or none.
/// @returns the calls it cost, and whether all agreed.
template <class Maker>
std::pair<std::uint64_t, bool> replay_agrees(Maker& maker, run_shared const& shared, std::uint64_t& differs) {
  std::uint64_t calls = 0;
  bool agree = true;
  for (std::uint64_t const i : shared.probed) {
    auto const before = std::find_if(shared.probes.begin(), shared.probes.end(), [i](probe const& p) { return p.sample == i; });
    if (before == shared.probes.end()) continue;
    ++calls;
    if (maker.look(i) == *before) continue;
    if (agree) differs = i;
    agree = false;
  }
  return {calls, agree};
}

inline std::string hidden_state_text(std::uint64_t sample) {
  return "Sample " + std::to_string(sample) +
         " came out differently when its words were replayed: the sampler or weighter keeps something between calls "
         "(often a distribution object that holds back a second normal). Make such objects anew in each call, or draw "
         "with draws.normal().";
}

/// A worker of a one-pass run: draws, weighs and reads blocks; keeps no state.
template <class Sampler, class Weighter, class... Es>
class run_worker {
 public:
  using state = state_of_t<Sampler>;

  run_worker(Sampler const& draw, Weighter const& weigh_with, run_shared& shared, std::tuple<Es...> const& estimators)
      : shared_(shared), maker_(draw, weigh_with, shared.terms), read_(estimators) {}

  void fill(std::uint64_t index, block& b) {
    bool const replicated = shared_.terms.source.replicates() > 0;
    b.clear(index * block_size);
    make_block(maker_, shared_, index, [&](std::uint64_t i, state const& x, double log_weight, std::span<double const>) {
      if (b.push(i, log_weight)) {
        if constexpr (reader<state, Es...>::columns > 0) read_.read(x, b.row(), b.stride());
      }
      if (replicated) b.push_group(static_cast<std::uint32_t>(shared_.terms.source.replicate_of(i)));
    });
    b.close(replicated ? how_drawn::replicated : how_drawn::independent);
  }
  [[nodiscard]] maker<Sampler, Weighter>& making() noexcept { return maker_; }

 private:
  run_shared& shared_;
  maker<Sampler, Weighter> maker_;
  reader<state, Es...> read_;
};

/// A stretch of kept samples, appended to the others in order.
template <class X>
struct kept_part {
  state_array<X> states;
  std::vector<double> log_weights;
  std::vector<std::vector<double>> scores;
  std::vector<std::uint64_t> samples;

  /// Room for so many samples in all.
  void reserve(std::size_t n, bool keep_states) {
    if (keep_states) states.reserve(n);
    log_weights.reserve(n);
    samples.reserve(n);
  }
  /// Empties the other one, whose memory stays with it.
  void append(kept_part& other) {
    states.append(std::move(other.states));
    log_weights.insert(log_weights.end(), other.log_weights.begin(), other.log_weights.end());
    scores.resize(other.scores.size());
    for (std::size_t k = 0; k < scores.size(); ++k)
      scores[k].insert(scores[k].end(), other.scores[k].begin(), other.scores[k].end());
    samples.insert(samples.end(), other.samples.begin(), other.samples.end());
    other.log_weights.clear();
    for (auto& column : other.scores) column.clear();
    other.samples.clear();
  }
};

/// A worker of a keeping run.
template <class Sampler, class Weighter>
class keeping_worker {
 public:
  using state = state_of_t<Sampler>;
  using making_t = maker<Sampler, Weighter>;

  keeping_worker(Sampler const& draw, Weighter const& weigh_with, run_shared& shared)
      : shared_(shared), maker_(draw, weigh_with, shared.terms) {}

  /// Adds the samples of a block; the one column of a plain weighter is the log-weight itself.
  void fill(std::uint64_t index, bool keep_states, std::uint64_t from, kept_part<state>& part) {
    if (making_t::items > 1) part.scores.resize(making_t::items);
    make_block(maker_, shared_, index, [&](std::uint64_t i, auto&& x, double log_weight, std::span<double const> scores) {
      if (i < from) return;
      if (keep_states) part.states.emplace_back(std::forward<decltype(x)>(x));
      part.log_weights.push_back(log_weight);
      for (std::size_t k = 0; k < part.scores.size(); ++k) part.scores[k].push_back(scores[k]);
      part.samples.push_back(i);
    });
  }
  [[nodiscard]] making_t& making() noexcept { return maker_; }

 private:
  run_shared& shared_;
  making_t maker_;
};

}  // namespace steelyard::inline v1::detail
