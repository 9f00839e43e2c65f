// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <utility>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>

namespace steelyard::inline v1::detail {

/// Up to 255 values that part all numbers into buckets: the bucket of x is the number of splitters at or below x.
/// The span of the splitters is cut into even slots, and a table says how many splitters lie below each; where no slot holds
/// more than four, those are counted one by one, else a search tree without branches is walked down.
///   rounding is monotone, so numbers in another slot lie beyond those in this one, whatever the slots' ends are
/// Cost  2 ns a number by slots, 4 ns by the tree.
class splitters {
 public:
  static constexpr std::size_t most = 255;

  splitters() = default;
  /// @param rising  at most 255 numbers, sorted; equal ones count once
  explicit splitters(std::vector<double> rising) : at_(std::move(rising)) {
    at_.erase(std::unique(at_.begin(), at_.end()), at_.end());
    count_ = at_.size();
    if (count_ == 0) return;
    if (!cut_slots()) plant();
  }

  [[nodiscard]] std::size_t buckets() const noexcept { return count_ + 1; }

  /// to[i] = bucket of values[i]
  void place(double const* values, std::size_t n, std::uint8_t* to) const noexcept {
    if (count_ == 0)
      std::fill_n(to, n, std::uint8_t{0});
    else if (steps_ == 1)
      by_slots<1>(values, n, to);
    else if (steps_ == 2)
      by_slots<2>(values, n, to);
    else if (steps_ > 0)
      by_slots<most_steps>(values, n, to);
    else
      by_tree(values, n, to);
  }

 private:
  static constexpr std::size_t slots = 8192;
  static constexpr std::size_t most_steps = 4;
  static constexpr std::size_t levels = 8;

  [[nodiscard]] std::size_t slot_of(double x) const noexcept {
    double t = times(minus(x, lower_), per_slot_);
    t = t > 0.0 ? t : 0.0;
    t = t < static_cast<double>(slots - 1) ? t : static_cast<double>(slots - 1);
    return static_cast<std::size_t>(static_cast<std::int32_t>(t)) % slots;
  }
  bool cut_slots() {
    lower_ = at_.front();
    per_slot_ = static_cast<double>(slots - 1) / (at_.back() - lower_);
    if (count_ == 1) per_slot_ = 0.0;
    if (!is_finite(lower_) || !is_finite(at_.back() - lower_) || !is_finite(per_slot_)) return false;
    below_.resize(slots);
    std::size_t filled = 0, held = 0;  // slots whose number is known; splitters in the slot of the one before
    for (std::size_t k = 0; k < count_; ++k) {
      std::size_t const slot = slot_of(at_[k]);
      if (slot >= filled) {
        std::fill(below_.begin() + static_cast<std::ptrdiff_t>(filled), below_.begin() + static_cast<std::ptrdiff_t>(slot + 1),
                  static_cast<std::uint8_t>(k));
        filled = slot + 1;
        held = 0;
      }
      if (++held > steps_) steps_ = held;
      if (steps_ > most_steps) {
        steps_ = 0;
        return false;
      }
    }
    std::fill(below_.begin() + static_cast<std::ptrdiff_t>(filled), below_.end(), static_cast<std::uint8_t>(count_));
    at_.resize(count_ + most_steps, double{at_.back()});
    return true;
  }
  /// Node k has children 2 k and 2 k + 1, larger numbers on the right.
  void plant() {
    constexpr std::size_t leaves = std::size_t{1} << levels;
    tree_.assign(leaves, at_.back());  // what lies at or above the last splitter lies above them all
    for (std::size_t node = 1; node < leaves; ++node) {
      std::size_t const depth = static_cast<std::size_t>(std::bit_width(node)) - 1;
      std::size_t const across = 2 * (node - (std::size_t{1} << depth)) + 1;  // in units of half a node's width
      std::size_t const k = (across << (levels - depth - 1)) - 1;
      if (k < count_) tree_[node] = at_[k];
    }
  }
  template <std::size_t Steps>
  void by_slots(double const* values, std::size_t n, std::uint8_t* to) const noexcept {
    std::uint8_t const* const below = below_.data();
    double const* const at = at_.data();
    std::size_t const last = count_;
    for (std::size_t i = 0; i < n; ++i) {
      double const x = values[i];
      std::size_t const first = below[slot_of(x)];
      std::size_t b = first;
      for (std::size_t k = 0; k < Steps; ++k) b += x >= at[first + k] ? 1u : 0u;
      to[i] = static_cast<std::uint8_t>(b < last ? b : last);
    }
  }
  void by_tree(double const* values, std::size_t n, std::uint8_t* to) const noexcept {
    double const* const tree = tree_.data();
    std::size_t const last = count_;
    auto const put = [&](std::size_t node, std::uint8_t& bucket) {
      std::size_t const b = node - (std::size_t{1} << levels);
      bucket = static_cast<std::uint8_t>(b < last ? b : last);
    };
    auto const down = [&](double x, std::size_t node) { return 2 * node + (x >= tree[node] ? 1u : 0u); };
    std::size_t i = 0;
    for (; i + 4 <= n; i += 4) {  // side by side, since each step waits for the one before
      double const w = values[i], x = values[i + 1], y = values[i + 2], z = values[i + 3];
      std::size_t of_w = 1, of_x = 1, of_y = 1, of_z = 1;
      for (std::size_t level = 0; level < levels; ++level) {
        of_w = down(w, of_w);
        of_x = down(x, of_x);
        of_y = down(y, of_y);
        of_z = down(z, of_z);
      }
      put(of_w, to[i]);
      put(of_x, to[i + 1]);
      put(of_y, to[i + 2]);
      put(of_z, to[i + 3]);
    }
    for (; i < n; ++i) {
      std::size_t node = 1;
      for (std::size_t level = 0; level < levels; ++level) node = down(values[i], node);
      put(node, to[i]);
    }
  }

  std::vector<double> at_;  // rising; where there are slots, the last one as often again as steps may pass the end
  std::size_t count_ = 0, steps_ = 0;
  double lower_ = 0.0, per_slot_ = 0.0;
  std::vector<std::uint8_t> below_;
  std::vector<double> tree_;
};

}  // namespace steelyard::inline v1::detail
