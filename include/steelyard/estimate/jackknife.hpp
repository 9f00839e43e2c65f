// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/block.hpp>
#include <steelyard/estimate/estimate.hpp>

namespace steelyard::inline v1::detail {

/// An estimator without an error of its own: one accumulator for each of at
/// most 64 groups (label mod 64, labels being ranks), and the delete-one-group jackknife over them.
///   theta_(g): the value without group g;  m_g: the group's share of the samples
///   u_g = (1 - m_g) (mean of theta_(.) - theta_(g)),  se^2 = c sum u_g^2       [Miller, Biometrika 61, 1974]
/// Assumes samples in an order that says nothing about them. In an ensemble that was sorted, or counted by value, neighbours
/// are alike, and runs of 16 of them are no independent groups: the error bar is too wide, and too narrow at great length.
template <class E>
class jackknife {
 public:
  explicit jackknife(E empty) : empty_(std::move(empty)) {}

  [[nodiscard]] jackknife fresh() const { return jackknife(empty_.fresh()); }
  [[nodiscard]] E& prepared() noexcept { return empty_; }

  void add(block const& b, std::size_t column, std::size_t columns) {
    weighted_view const v = b.view(column, columns);
    std::size_t const n = v.weights.size();
    for (std::size_t from = 0; from < n;) {
      if (!v.counts.empty()) {
        add_copies(b, v, from, columns);
        ++from;
        continue;
      }
      std::size_t const g = group_of(b, v, from);
      std::size_t to = from + 1;
      while (to < n && group_of(b, v, to) == g) ++to;
      add_run(g, v, from, to, columns);
      from = to;
    }
  }
  void rescale(double factor) {
    for (std::optional<E>& each : slots_)
      if (each) each->rescale(factor);
  }
  jackknife& operator+=(jackknife const& other) {
    for (std::size_t g = 0; g < other.slots_.size(); ++g) {
      if (!other.slots_[g]) continue;
      if (slots_.size() <= g) slots_.resize(g + 1);
      if (slots_[g])
        *slots_[g] += *other.slots_[g];
      else
        slots_[g].emplace(*other.slots_[g]);
    }
    return *this;
  }

  /// @param shares  each group's share of the samples, those of weight zero included
  [[nodiscard]] estimate answer(run_facts facts, std::span<double const> shares) const {
    std::size_t const groups = shares.size();
    std::vector<E> before, after;  // sums of the groups below, and of those above, counted from the end
    before.reserve(groups + 1);
    after.reserve(groups + 1);
    before.push_back(empty_.fresh());
    after.push_back(empty_.fresh());
    for (std::size_t g = 0; g < groups; ++g) {
      before.push_back(before.back());
      if (holds(g)) before.back() += *slots_[g];
      after.push_back(after.back());
      if (holds(groups - 1 - g)) after.back() += *slots_[groups - 1 - g];
    }
    double const value = static_cast<double>(before.back().value());
    facts.groups = static_cast<double>(groups);
    facts.group_share_squares = 0.0;
    std::vector<double> moved(groups);
    double sum = 0.0, whole = 0.0;
    for (std::size_t g = 0; g < groups; ++g) {
      if (holds(g)) {
        E rest = before[g];
        rest += after[groups - 1 - g];
        moved[g] = static_cast<double>(rest.value()) - value;
        if (!is_finite(moved[g])) return estimate(value, {}, facts);
      }
      sum += (1.0 - shares[g]) * moved[g];
      whole += 1.0 - shares[g];
      facts.group_share_squares += shares[g] * shares[g];
    }
    error_terms terms;
    for (std::size_t g = 0; g < groups && whole > 0.0; ++g) {
      double const u = (1.0 - shares[g]) * (sum / whole - moved[g]), square = u * u;
      terms.sum_squares += square;
      terms.sum_fourth += square * square;
      terms.largest_square = std::max(terms.largest_square, square);
    }
    return estimate(value, terms, facts);
  }

  /// Into a checkpoint, and back.
  template <class Out>
  void save(Out& out) const {
    out.put(static_cast<std::uint64_t>(slots_.size()));
    for (std::optional<E> const& each : slots_) {
      out.put(static_cast<std::uint8_t>(each.has_value() ? 1 : 0));
      if (each) out.put_each(E::fields(*each));
    }
  }
  template <class In>
  void load(In& in) {
    slots_.clear();
    std::uint64_t const size = in.template next<std::uint64_t>();
    for (std::uint64_t g = 0; g < size; ++g)
      if (in.template next<std::uint8_t>() != 0) in.get_each(E::fields(group(static_cast<std::size_t>(g))));
  }

  /// The accumulator of a group, made where there is none yet.
  [[nodiscard]] E& group(std::size_t g) {
    if (slots_.size() <= g) slots_.resize(g + 1);
    if (!slots_[g]) slots_[g].emplace(empty_.fresh());
    return *slots_[g];
  }
  [[nodiscard]] bool holds(std::size_t g) const noexcept { return g < slots_.size() && slots_[g].has_value(); }

 private:
  [[nodiscard]] static std::size_t group_of_sample(std::uint64_t sample) noexcept {
    return static_cast<std::size_t>(sample / jackknife_run % jackknife_groups);
  }
  [[nodiscard]] static std::size_t group_of(block const& b, weighted_view const& v, std::size_t i) {
    return v.groups.empty() ? group_of_sample(b.samples()[i]) : v.groups[i] % jackknife_groups;
  }
  void add_run(std::size_t g, weighted_view const& v, std::size_t from, std::size_t to, std::size_t columns) {
    std::size_t const n = v.weights.size();
    E& sums = group(g);
    if (columns <= 1) {
      sums.add(v.values.subspan(columns * from, columns * (to - from)), v.weights.subspan(from, to - from));
      return;
    }
    scratch_.clear();
    for (std::size_t c = 0; c < columns; ++c)
      for (std::size_t i = from; i < to; ++i) scratch_.push_back(v.values[c * n + i]);
    sums.add(scratch_, v.weights.subspan(from, to - from));
  }
  /// An entry that stands for several samples is added that often, each copy to the group it would have on its own.
  void add_copies(block const& b, weighted_view const& v, std::size_t i, std::size_t columns) {
    std::size_t const n = v.weights.size();
    std::uint64_t at = b.first_copy(i), left = v.counts[i];
    while (left > 0) {
      std::uint64_t const run = v.groups.empty() ? jackknife_run - at % jackknife_run : block_size;
      std::size_t const now = static_cast<std::size_t>(std::min(left, run));
      scratch_.clear();
      for (std::size_t c = 0; c < columns; ++c) scratch_.insert(scratch_.end(), now, v.values[c * n + i]);
      copies_.assign(now, v.weights[i]);
      group(v.groups.empty() ? group_of_sample(at) : group_of(b, v, i)).add(scratch_, copies_);
      at += now;
      left -= now;
    }
  }

  E empty_;
  std::vector<std::optional<E>> slots_;
  std::vector<double> scratch_, copies_;
};

}  // namespace steelyard::inline v1::detail
