// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <tuple>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/elementary.hpp>
#include <steelyard/estimate/block.hpp>
#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/everything.hpp>
#include <steelyard/estimate/jackknife.hpp>

namespace steelyard::inline v1::detail {

/// Groups of the sample as answers need them.
struct group_facts {
  std::vector<double> jackknife_shares;  ///< share of the samples in each group of the jackknife
};

/// Shares of n independent samples in the groups (sample / 16) mod 64.
inline std::vector<double> independent_shares(std::uint64_t n) {
  std::vector<double> shares;
  for (std::uint64_t g = 0; g < jackknife_groups && g * jackknife_run < n; ++g) {
    std::uint64_t const cycle = jackknife_groups * jackknife_run, rest = n % cycle, start = g * jackknife_run;
    std::uint64_t const last = rest <= start ? 0 : rest - start < jackknife_run ? rest - start : jackknife_run;
    shares.push_back(static_cast<double>(n / cycle * jackknife_run + last) / static_cast<double>(n));
  }
  return shares;
}

/// An estimator with its own error, fed from blocks.
template <class E>
class own_error_slot {
 public:
  explicit own_error_slot(E empty) : sums_(std::move(empty)) {}
  [[nodiscard]] own_error_slot fresh() const { return own_error_slot(sums_.fresh()); }
  [[nodiscard]] E& prepared() noexcept { return sums_; }
  void add(block const& b, std::size_t column, std::size_t columns) {
    if constexpr (requires { sums_.take(b); }) {
      sums_.take(b);
    } else {
      weighted_view const v = takes_zeros<E> ? b.all() : b.view(column, columns);
      if (!v.weights.empty()) sums_.add(v.values, v.weights, v);
    }
  }
  template <class Out>
  void save(Out& out) const {
    out.put_each(E::fields(sums_));
  }
  template <class In>
  void load(In& in) {
    in.get_each(E::fields(sums_));
  }
  void rescale(double factor) { sums_.rescale(factor); }
  own_error_slot& operator+=(own_error_slot const& other) {
    sums_ += other.sums_;
    return *this;
  }
  [[nodiscard]] auto answer(run_facts const& facts, group_facts const&) const { return sums_.answer(facts); }

 private:
  E sums_;
};

template <class E>
class jackknife_slot : public jackknife<E> {
 public:
  using jackknife<E>::jackknife;
  [[nodiscard]] jackknife_slot fresh() const { return jackknife_slot(jackknife<E>::fresh()); }
  explicit jackknife_slot(jackknife<E> base) : jackknife<E>(std::move(base)) {}
  [[nodiscard]] auto answer(run_facts const& facts, group_facts const& groups) const {
    return jackknife<E>::answer(facts, groups.jackknife_shares);
  }
};

template <class E>
using slot_t = std::conditional_t<takes_everything<E>, everything_slot<E>,
                                  std::conditional_t<states_its_error<E>, own_error_slot<E>, jackknife_slot<E>>>;

/// First readout column of estimator I, among estimators run on `State`.
template <class State, class... Es>
struct column_plan {
  static constexpr std::size_t sizes[sizeof...(Es) + 1] = {columns_of<readouts_t<Es>, State>::size..., 0};
  static constexpr std::size_t first(std::size_t i) noexcept {
    std::size_t sum = 0;
    for (std::size_t k = 0; k < i; ++k) sum += sizes[k];
    return sum;
  }
  static constexpr std::size_t total = (columns_of<readouts_t<Es>, State>::size + ... + 0);
};

/// What some blocks added up to: the weights and every estimator, relative to
/// one maximum. Merging is the only way two of them meet.
template <class... Es>
struct node {
  weight_totals totals;
  std::tuple<slot_t<Es>...> slots;

  explicit node(std::tuple<slot_t<Es>...> empty) : slots(std::move(empty)) {}
  [[nodiscard]] node fresh() const {
    return std::apply([](auto const&... each) { return node(std::tuple<slot_t<Es>...>(each.fresh()...)); }, slots);
  }

  template <class State>
  void add(block const& b) {
    totals = b.totals();
    add_each<State>(b, std::index_sequence_for<Es...>{});
  }

  /// Into a checkpoint, and back.
  template <class Out>
  void save(Out& out) const {
    out.put_each(weight_totals::fields(totals));
    std::apply([&](auto const&... each) { (each.save(out), ...); }, slots);
  }
  template <class In>
  void load(In& in) {
    in.get_each(weight_totals::fields(totals));
    std::apply([&](auto&... each) { (each.load(in), ...); }, slots);
  }

  /// Right block range after left: both are brought to the larger maximum first.
  node& operator+=(node const& right) {
    if (right.totals.maximum > totals.maximum) {
      rescale(right.totals.maximum);
    } else if (right.totals.maximum < totals.maximum) {
      node lowered = right;
      lowered.rescale(totals.maximum);
      join(lowered);
      return *this;
    }
    join(right);
    return *this;
  }

 private:
  template <class State, std::size_t... I>
  void add_each(block const& b, std::index_sequence<I...>) {
    using plan = column_plan<State, Es...>;
    (check<Es>(b, plan::first(I), plan::sizes[I]), ...);
    (std::get<I>(slots).add(b, plan::first(I), plan::sizes[I]), ...);
  }
  template <class E>
  static void check(block const& b, std::size_t column, std::size_t columns) {
    if constexpr (!takes_any_number<E>) b.refuse_not_finite(column, columns);
  }
  void rescale(double maximum) {
    if (totals.maximum > impossible) {
      double const gap = totals.maximum - maximum, factor = portable_exp(gap);
      totals.rescale(factor, gap);
      std::apply([&](auto&... each) { (each.rescale(factor), ...); }, slots);
    }
    totals.maximum = maximum;
  }
  void join(node const& right) {
    totals.join(right.totals);
    join_each(right, std::index_sequence_for<Es...>{});
  }
  template <std::size_t... I>
  void join_each(node const& right, std::index_sequence<I...>) {
    ((std::get<I>(slots) += std::get<I>(right.slots)), ...);
  }
};

/// A binary counter over the block index: equal neighbours merge at once, so
/// the tree depends on where the blocks lie and not on how many there are.
template <class Node>
class block_tree {
 public:
  /// @param level  the node covers 2^level blocks, and starts at a multiple of that
  void push(std::unique_ptr<Node> node, unsigned level = 0) {
    while (!stack_.empty() && stack_.back().level == level) {
      std::unique_ptr<Node> left = std::move(stack_.back().node);
      stack_.pop_back();
      *left += *node;
      node = std::move(left);
      ++level;
    }
    stack_.push_back({std::move(node), level});
  }

  /// Everything merged, from the right; the parts stay. @pre something was pushed
  [[nodiscard]] std::unique_ptr<Node> total() const {
    auto sum = std::make_unique<Node>(*stack_.back().node);
    for (std::size_t k = stack_.size() - 1; k-- > 0;) {
      auto left = std::make_unique<Node>(*stack_[k].node);
      *left += *sum;
      sum = std::move(left);
    }
    return sum;
  }

  /// The one node that a whole stretch became. @pre 2^level blocks were pushed
  [[nodiscard]] std::unique_ptr<Node> release() {
    std::unique_ptr<Node> whole = std::move(stack_.back().node);
    stack_.clear();
    return whole;
  }

  /// Into a checkpoint, and back; `empty` is a node to load into.
  template <class Out>
  void save(Out& out) const {
    out.put(static_cast<std::uint64_t>(stack_.size()));
    for (entry const& each : stack_) {
      out.put(each.level);
      each.node->save(out);
    }
  }
  template <class In>
  void load(In& in, Node const& empty) {
    stack_.clear();
    std::uint64_t const size = in.template next<std::uint64_t>();
    for (std::uint64_t k = 0; k < size; ++k) {
      unsigned const level = in.template next<unsigned>();
      auto node = std::make_unique<Node>(empty.fresh());
      node->load(in);
      stack_.push_back({std::move(node), level});
    }
  }

 private:
  struct entry {
    std::unique_ptr<Node> node;
    unsigned level;
  };
  std::vector<entry> stack_;
};

}  // namespace steelyard::inline v1::detail
