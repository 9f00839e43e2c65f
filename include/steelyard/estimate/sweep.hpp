// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <exception>
#include <limits>
#include <memory>
#include <mutex>
#include <tuple>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/estimate/accumulation.hpp>

namespace steelyard::inline v1::detail {

/// An exception together with the sample that met it.
struct located {
  std::uint64_t sample;
  std::exception_ptr what;
};

/// Keeps the exception of the lowest sample, whatever the threads.
class first_failure {
 public:
  [[nodiscard]] bool before(std::uint64_t sample) const noexcept { return lowest_.load() <= sample; }
  void report(std::uint64_t sample, std::exception_ptr what) {
    std::lock_guard const lock(mutex_);
    if (sample >= lowest_.load()) return;
    lowest_.store(sample);
    what_ = std::move(what);
  }
  void rethrow() const {
    if (what_) std::rethrow_exception(what_);
  }
  /// Calls `act`; what it throws is kept for `sample`, or for the sample it names.
  template <class Act>
  void guard(std::uint64_t sample, Act act) {
    try {
      act();
    } catch (located const& failure) {
      report(failure.sample, failure.what);
    } catch (...) {
      report(sample, std::current_exception());
    }
  }

 private:
  std::atomic<std::uint64_t> lowest_{std::numeric_limits<std::uint64_t>::max()};
  std::mutex mutex_;
  std::exception_ptr what_;
};

/// A stretch of 2^level blocks that starts at a multiple of its length.
struct stretch {
  std::uint64_t first;
  unsigned level;
};

/// Cuts blocks [first, last) into aligned stretches of at most 2^highest blocks.
inline std::vector<stretch> stretches(std::uint64_t first, std::uint64_t last, unsigned highest) {
  std::vector<stretch> all;
  while (first < last) {
    unsigned level = 0;
    while (level < highest && first % (std::uint64_t{2} << level) == 0 && first + (std::uint64_t{2} << level) <= last)
      ++level;
    all.push_back({first, level});
    first += std::uint64_t{1} << level;
  }
  return all;
}

/// Whether an estimator must see the first entries before it can add any.
template <class E>
bool wants_pilot(E const& e) {
  if constexpr (prepares<E> && requires { e.wants_pilot(); })
    return e.wants_pilot();
  else
    return prepares<E>;
}

inline constexpr unsigned longest_stretch = 4;         // 16 blocks are one task
inline constexpr std::size_t pilot_entries = 4096;     // what `prepare` is shown
inline constexpr std::uint64_t pilot_blocks = 1024;    // and how far it may look for them

/// Feeds blocks to estimators and merges what they accumulate in a fixed tree:
/// the same bits for any threads, executor and order of the tasks.
/// A worker fills blocks: `fill(index, block)` leaves a closed block.
template <class State, class... Es>
class sweep {
 public:
  using node_type = node<Es...>;
  static constexpr std::size_t columns = column_plan<State, Es...>::total;

  explicit sweep(std::tuple<Es...> const& estimators)
      : empty_(std::apply([](Es const&... e) { return std::tuple<slot_t<Es>...>(slot_t<Es>(e.fresh())...); }, estimators)),
        prepared_(!std::apply([](Es const&... e) { return (wants_pilot(e) || ... || false); }, estimators)) {}

  /// Takes in blocks [first, last), which follow those taken in before.
  template <class Worker>
  void take(std::uint64_t first, std::uint64_t last, executor const& execute, worker_pool<Worker>& pool) {
    if constexpr ((prepares<Es> || ...))
      if (!prepared_) {
        first = pilot(first, last, execute, pool);
        if (!prepared_) return;
      }
    std::vector<stretch> const tasks = stretches(first, last, longest_stretch);
    std::vector<std::unique_ptr<node_type>> done(tasks.size());
    first_failure failure;
    execute(tasks.size(), [&](std::size_t t) {
      stretch const& task = tasks[t];
      failure.guard(task.first * block_size, [&] {
        auto const worker = pool.take();
        auto const buffer = buffers_.take();
        block_tree<node_type> tree;
        for (std::uint64_t b = task.first; b < task.first + (std::uint64_t{1} << task.level); ++b) {
          if (failure.before(b * block_size)) return;
          worker->fill(b, *buffer);
          tree.push(node_of(*buffer));
        }
        done[t] = tree.release();
      });
    });
    failure.rethrow();
    for (std::size_t t = 0; t < tasks.size(); ++t) tree_.push(std::move(done[t]), tasks[t].level);
  }

  /// Everything merged so far, at the end of the run. @pre at least one block was taken in
  [[nodiscard]] std::unique_ptr<node_type> finish() {
    if constexpr ((prepares<Es> || ...))
      if (!prepared_) settle_pilot();
    return tree_.total();
  }
  /// Everything merged so far, and the run goes on. @pre ready()
  [[nodiscard]] std::unique_ptr<node_type> so_far() const { return tree_.total(); }
  /// False while blocks are held back for an estimator that must see the first entries.
  [[nodiscard]] bool ready() const noexcept { return prepared_; }

  /// Into a checkpoint, and back. @pre ready()
  template <class Out>
  void save(Out& out) const {
    out.put(static_cast<std::uint64_t>(shown_.size()));
    for (auto const& [values, weights] : shown_) {
      out.put(values);
      out.put(weights);
    }
    tree_.save(out);
  }
  template <class In>
  void load(In& in) {
    shown_.resize(static_cast<std::size_t>(in.template next<std::uint64_t>()));
    for (auto& [values, weights] : shown_) {
      in.get(values);
      in.get(weights);
    }
    if (!prepared_) {
      std::size_t at = 0;
      std::apply([&](auto&... slot) { (prepare_again(slot, at), ...); }, empty_.slots);
      prepared_ = true;
    }
    tree_.load(in, empty_);
  }

 private:
  [[nodiscard]] std::unique_ptr<node_type> node_of(block const& b) const {
    auto one = std::make_unique<node_type>(empty_.fresh());
    one->template add<State>(b);
    return one;
  }

  /// Holds blocks back until there are enough entries to prepare from.
  template <class Worker>
  std::uint64_t pilot(std::uint64_t first, std::uint64_t last, executor const& execute, worker_pool<Worker>& pool) {
    while (first < last && !prepared_) {
      std::uint64_t const wanted = held_.empty() ? pilot_entries / block_size : held_.size();
      std::size_t const now = static_cast<std::size_t>(std::min({wanted, last - first, pilot_blocks - held_.size()}));
      std::size_t const from = held_.size();
      std::vector<std::unique_ptr<block>> fresh(now);
      first_failure failure;
      execute(now, [&](std::size_t k) {
        std::uint64_t const b = first + k;
        failure.guard(b * block_size, [&] {
          auto const worker = pool.take();
          fresh[k] = std::make_unique<block>(columns);
          worker->fill(b, *fresh[k]);
        });
      });
      failure.rethrow();
      for (auto& each : fresh) held_.push_back(std::move(each));
      for (std::size_t k = from; k < held_.size(); ++k) held_kept_ += held_[k]->kept();
      first += now;
      if (held_kept_ >= pilot_entries || held_.size() >= pilot_blocks) settle_pilot();
    }
    return first;
  }
  void settle_pilot() {
    prepare_each(std::index_sequence_for<Es...>{});
    prepared_ = true;
    for (auto const& each : held_) tree_.push(node_of(*each));
    held_.clear();
  }
  template <std::size_t... I>
  void prepare_each(std::index_sequence<I...>) {
    (prepare_one<I, Es>(), ...);
  }
  /// Shows estimator I the first entries, their weights relative to the largest among them.
  template <std::size_t I, class E>
  void prepare_one() {
    if constexpr (prepares<E>) {
      using plan = column_plan<State, Es...>;
      constexpr std::size_t n = plan::sizes[I];
      double maximum = impossible;
      for (auto const& each : held_) maximum = std::max(maximum, each->totals().maximum);
      std::vector<double> weights;
      std::vector<std::vector<double>> of_column(n);
      for (auto const& each : held_) {
        weighted_view const v = each->view(plan::first(I), n);
        double const factor = each->kept() > 0 ? portable_exp(each->totals().maximum - maximum) : 0.0;
        for (std::size_t j = 0; j < each->kept() && weights.size() < pilot_entries; ++j) {
          weights.push_back(v.weights[j] * factor * v.count(j));
          for (std::size_t c = 0; c < n; ++c) of_column[c].push_back(v.values[c * each->kept() + j]);
        }
      }
      std::vector<double> values;
      for (auto const& column : of_column) values.insert(values.end(), column.begin(), column.end());
      std::get<I>(empty_.slots).prepared().prepare(std::span<double const>(values), std::span<double const>(weights));
      shown_.emplace_back(std::move(values), std::move(weights));
    }
  }
  template <class Slot>
  void prepare_again(Slot& slot, std::size_t& at) {
    if constexpr (prepares<std::remove_cvref_t<decltype(slot.prepared())>>) {
      slot.prepared().prepare(std::span<double const>(shown_.at(at).first), std::span<double const>(shown_.at(at).second));
      ++at;
    }
  }

  node_type empty_;
  block_tree<node_type> tree_;
  worker_pool<block> buffers_{[] { return std::make_unique<block>(columns); }};
  bool prepared_;
  std::vector<std::unique_ptr<block>> held_;
  std::size_t held_kept_ = 0;
  std::vector<std::pair<std::vector<double>, std::vector<double>>> shown_;  // what `prepare` was shown, for checkpoints
};

}  // namespace steelyard::inline v1::detail
