// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <tuple>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/moment_lanes.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/group_sums.hpp>

namespace steelyard::inline v1::detail {

/// A ratio of sums, r = sum m a / sum m b, and what its error bar needs: with
/// e = a - r b the sums of m e^2, e b, b^2 and of m e^4, e^3 b, ..., b^4, and e, b for each group.
/// The reference r of a part need not be its own ratio. Pairwise merge: e + (r - r') b is expanded by the
/// binomial formula on both sides; no difference of large sums is formed.
class ratio_sums {
 public:
  [[nodiscard]] double top() const noexcept { return top_; }
  [[nodiscard]] double bottom() const noexcept { return bottom_; }
  [[nodiscard]] double ratio() const noexcept { return top_ / bottom_; }

  /// Terms i in [0, n) with count m(i), parts a(i) and b(i), and group(i) where `grouped`.
  template <class Count, class Top, class Bottom, class Group>
  void add(std::size_t n, Count m, Top a, Bottom b, bool grouped, Group group) {
    ratio_sums block;
    double squares = 0.0;
    for (std::size_t i = 0; i < n; ++i) {
      block.top_ += m(i) * a(i);
      block.bottom_ += m(i) * b(i);
      squares += m(i) * b(i) * b(i);
    }
    block.reference_ = reference(block.top_, block.bottom_, squares);
    for (std::size_t i = 0; i < n; ++i) {
      double const e = a(i) - block.reference_ * b(i), g = b(i), count = m(i);
      double const ee = e * e, eg = e * g, gg = g * g;
      block.second_[0] += count * ee;
      block.second_[1] += count * eg;
      block.second_[2] += count * gg;
      block.fourth_[0] += count * (ee * ee);
      block.fourth_[1] += count * (ee * eg);
      block.fourth_[2] += count * (ee * gg);
      block.fourth_[3] += count * (eg * gg);
      block.fourth_[4] += count * (gg * gg);
      if (grouped) block.groups_.push(group(i), {count * e, count * g});
    }
    block.groups_.settle();
    *this += block;
  }

  /// Terms with count 1 and b = 1, their a given: the vector kernels.
  void add_even(std::span<double const> a) {
    ratio_sums block;
    double const n = static_cast<double>(a.size());
    double firsts[2], powers[4];
    sum_block<block_sums::first>(a, a, 0.0, 0.0, 0.0, firsts);
    block.top_ = firsts[0];
    block.bottom_ = n;
    double const r = block.reference_ = block.top_ / n;
    sum_block<block_sums::spread>({}, a, r, r, r, powers);
    block.second_ = {powers[1], powers[0], n};
    block.fourth_ = {powers[3], powers[2], powers[1], powers[0], n};
    *this += block;
  }

  /// Multiplies every a by `of_top` and every b by `of_bottom`.
  void rescale(double of_top, double of_bottom) {
    top_ *= of_top;
    bottom_ *= of_bottom;
    if (of_top != of_bottom) reference_ = of_bottom == 1.0 ? reference_ * of_top : reference_ * (of_top / of_bottom);
    double const t = of_top, b = of_bottom;
    second_[0] *= t * t;
    second_[1] *= t * b;
    second_[2] *= b * b;
    fourth_[0] *= (t * t) * (t * t);
    fourth_[1] *= (t * t) * (t * b);
    fourth_[2] *= (t * t) * (b * b);
    fourth_[3] *= (t * b) * (b * b);
    fourth_[4] *= (b * b) * (b * b);
    groups_.for_each([&](auto& sums) {
      sums[0] *= t;
      sums[1] *= b;
    });
  }

  ratio_sums& operator+=(ratio_sums const& other) {
    ratio_sums right = other;
    top_ += right.top_;
    bottom_ += right.bottom_;
    double const common = reference(top_, bottom_, second_[2] + right.second_[2]);
    move_to(common);
    right.move_to(common);
    for (std::size_t k = 0; k < 3; ++k) second_[k] += right.second_[k];
    for (std::size_t k = 0; k < 5; ++k) fourth_[k] += right.fourth_[k];
    groups_ += right.groups_;
    return *this;
  }

  /// u_g = sum over g of (a - r b) / scale for each group, by its label.
  template <class Take>
  void each_group(double scale, Take take) const {
    ratio_sums last = *this;
    last.move_to(ratio());
    for (std::size_t g = 0; g < last.groups_.size(); ++g) take(last.groups_.label(g), last.groups_[g][0] / scale);
  }

  /// Terms of the ratio over its bottom: u = (a - r b) / scale.
  [[nodiscard]] error_terms terms(double scale, bool grouped) const {
    error_terms terms;
    if (bottom_ == 0.0 || scale == 0.0) return terms;
    ratio_sums last = *this;
    last.move_to(ratio());
    if (grouped) {
      for (std::size_t g = 0; g < last.groups_.size(); ++g) {
        double const u = last.groups_[g][0] / scale, square = u * u;
        terms.sum_squares += square;
        terms.sum_fourth += square * square;
        terms.largest_square = std::max(terms.largest_square, square);
      }
      return terms;
    }
    double const square = 1.0 / (scale * scale);
    terms.sum_squares = std::max(0.0, last.second_[0]) * square;
    terms.sum_fourth = std::max(0.0, last.fourth_[0]) * square * square;
    return terms;
  }

  /// act(sum m a) for each group.
  template <class Act>
  void each_top(Act act) const {
    for (std::size_t g = 0; g < groups_.size(); ++g) act(groups_[g][0] + reference_ * groups_[g][1]);
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.top_, self.bottom_, self.reference_, self.second_, self.fourth_),
                          group_sums<2>::fields(self.groups_));
  }

 private:
  /// The ratio itself, unless its bottom cannot be told from zero.
  static double reference(double top, double bottom, double squares) noexcept {
    return bottom * bottom > 1e-3 * squares ? top / bottom : 0.0;
  }
  void move_to(double common) {
    double const s = reference_ - common;
    auto& f = fourth_;
    f[0] += s * (4.0 * f[1] + s * (6.0 * f[2] + s * (4.0 * f[3] + s * f[4])));
    f[1] += s * (3.0 * f[2] + s * (3.0 * f[3] + s * f[4]));
    f[2] += s * (2.0 * f[3] + s * f[4]);
    f[3] += s * f[4];
    second_[0] += s * (2.0 * second_[1] + s * second_[2]);
    second_[1] += s * second_[2];
    groups_.for_each([&](auto& sums) { sums[0] += s * sums[1]; });
    reference_ = common;
  }

  double top_ = 0.0, bottom_ = 0.0, reference_ = 0.0;
  std::array<double, 3> second_{};
  std::array<double, 5> fourth_{};
  group_sums<2> groups_;
};

}  // namespace steelyard::inline v1::detail
