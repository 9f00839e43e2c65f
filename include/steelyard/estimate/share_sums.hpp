// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>
#include <type_traits>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/run_facts.hpp>

namespace steelyard::inline v1::detail {

/// Powers of the weights that fell into one of K cells, cells without overlap:
/// sum m w, sum m w^2, sum m w^4.
struct cell_sums {
  double weight = 0.0, second = 0.0, fourth = 0.0;

  void add(double count, double w) noexcept {
    double const w2 = w * w;
    weight += count * w;
    second += count * w2;
    fourth += count * (w2 * w2);
  }
  void rescale(double factor) noexcept {
    double const square = factor * factor;
    weight *= factor;
    second *= square;
    fourth *= square * square;
  }
  cell_sums& operator+=(cell_sums const& other) noexcept {
    weight += other.weight;
    second += other.second;
    fourth += other.fourth;
    return *this;
  }
};

/// Asks for numbers that are soon to be read, as far as there are any.
inline void ask_for([[maybe_unused]] std::span<double const> from, [[maybe_unused]] std::size_t first,
                    [[maybe_unused]] std::size_t n) noexcept {
#if defined(__GNUC__)
  constexpr std::size_t line = 8;
  for (std::size_t i = first; i < std::min(first + n, from.size()); i += line) __builtin_prefetch(from.data() + i);
#endif
}
/// Numbers that are worked on at once where there are two kinds of work, so that one fills the other's waits, and how far
/// ahead of them the next are asked for.
inline constexpr std::size_t side_by_side = 64;
inline constexpr std::size_t far_ahead = 256;

/// Adds weights to the cells of values. Sums lie 32 bytes apart meanwhile, so that two of the three go through one register,
/// and each second entry has sums of its own, so that neighbours in one cell do not wait for each other.
/// @param cells_of  writes the cells of some values to an array
template <class CellsOf>
void add_to_cells(std::vector<cell_sums>& cells, std::span<double const> values, std::span<double const> weights,
                  CellsOf cells_of) {
  constexpr std::size_t run = side_by_side;
  struct alignas(32) powers {
    double of[4] = {};  // w, w^2, w^4
    void add(double w) noexcept {
      double const w2 = w * w;
      of[0] += w;
      of[1] += w2;
      of[2] += w2 * w2;
    }
  };
  std::uint64_t at[run];
  std::vector<powers> sums(2 * cells.size());
  powers *const even = sums.data(), *const odd = even + cells.size();
  auto const add_run = [&](std::size_t first, auto n) {  // n known to the compiler where it can be
    ask_for(values, first + far_ahead, n);
    ask_for(weights, first + far_ahead, n);
    cells_of(values.subspan(first, n), at);
    double const* const from = weights.data() + first;
    for (std::size_t i = 0; i + 1 < n; i += 2) {
      even[at[i]].add(from[i]);
      odd[at[i + 1]].add(from[i + 1]);
    }
    if (n % 2 != 0) even[at[n - 1]].add(from[n - 1]);
  };
  std::size_t first = 0;
  for (; first + run <= weights.size(); first += run) add_run(first, std::integral_constant<std::size_t, run>());
  if (first < weights.size()) add_run(first, weights.size() - first);
  for (std::size_t b = 0; b < cells.size(); ++b)
    cells[b] += cell_sums{even[b].of[0] + odd[b].of[0], even[b].of[1] + odd[b].of[1], even[b].of[2] + odd[b].of[2]};
}

/// Share p of one cell, or of several, against the rest of a whole:
///   sum u^2 = (1-p)^2 Q_in + p^2 Q_out, sums of terms that are never negative.
/// @param largest   largest u_g^2 where there are groups (see `group_terms`)
inline error_terms share_terms(cell_sums const& in, cell_sums const& out) noexcept {
  double const total = in.weight + out.weight;
  error_terms terms;
  if (!(total > 0.0)) return terms;
  double const p = in.weight / total, q = out.weight / total, scale = 1.0 / (total * total);
  terms.sum_squares = (q * q * in.second + p * p * out.second) * scale;
  terms.sum_fourth = (q * q * q * q * in.fourth + p * p * p * p * out.fourth) * scale * scale;
  return terms;
}

/// Weight that each group has in each cell: cells are kept sparsely, as one
/// label for each pair of group and cell that occurs.
class grouped_cells {
 public:
  void add(std::uint32_t group, std::uint32_t cell, double weight) { entries_.push_back({group, cell, weight}); }
  [[nodiscard]] bool empty() const noexcept { return entries_.empty(); }

  void settle() {
    auto const before = [](entry const& a, entry const& b) {
      return a.group != b.group ? a.group < b.group : a.cell < b.cell;
    };
    std::stable_sort(entries_.begin(), entries_.end(), before);
    std::size_t kept = 0;
    for (std::size_t i = 0; i < entries_.size(); ++i) {
      if (kept > 0 && entries_[kept - 1].group == entries_[i].group && entries_[kept - 1].cell == entries_[i].cell)
        entries_[kept - 1].weight += entries_[i].weight;
      else
        entries_[kept++] = entries_[i];
    }
    entries_.resize(kept);
  }
  void rescale(double factor) {
    for (entry& each : entries_) each.weight *= factor;
  }
  grouped_cells& operator+=(grouped_cells const& other) {
    entries_.insert(entries_.end(), other.entries_.begin(), other.entries_.end());
    settle();
    return *this;
  }

  /// act(group, cell, weight), group by group.
  template <class Act>
  void for_each(Act act) const {
    for (entry const& each : entries_) act(each.group, each.cell, each.weight);
  }

  /// Terms of the share of the cells chosen by `in`, within those chosen by `whole`.
  template <class In, class Whole>
  [[nodiscard]] error_terms terms(In in, Whole whole) const {
    double inside = 0.0, total = 0.0;
    for (entry const& each : entries_)
      if (whole(each.cell)) {
        total += each.weight;
        if (in(each.cell)) inside += each.weight;
      }
    error_terms terms;
    if (!(total > 0.0)) return terms;
    double const p = inside / total;
    for (std::size_t i = 0; i < entries_.size();) {
      double u = 0.0;
      std::uint32_t const group = entries_[i].group;
      for (; i < entries_.size() && entries_[i].group == group; ++i)
        if (whole(entries_[i].cell)) u += entries_[i].weight * ((in(entries_[i].cell) ? 1.0 : 0.0) - p);
      double const square = (u / total) * (u / total);
      terms.sum_squares += square;
      terms.sum_fourth += square * square;
      terms.largest_square = std::max(terms.largest_square, square);
    }
    return terms;
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tie(self.entries_);
  }

 private:
  struct entry {
    std::uint32_t group;
    std::uint32_t cell;
    double weight;
  };
  std::vector<entry> entries_;
};

/// A share as an estimate: on the logit scale, one-sided where all or nothing fell in.
inline estimate share_estimate(double in, double out, error_terms const& terms, bool seen, bool missed,
                               run_facts const& facts) {
  if (!seen) return estimate::one_sided(false, facts);
  if (!missed) return estimate::one_sided(true, facts);
  return estimate(in / (in + out), terms, facts, error_scale::logit);
}

}  // namespace steelyard::inline v1::detail
