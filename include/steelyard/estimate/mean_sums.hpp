// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <tuple>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/moment_lanes.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/run_facts.hpp>

namespace steelyard::inline v1::detail {

/// Weighted means of N columns and what their error bars need, about the
/// running mean. Weights w, integer counts m, d = f - mean:
///   weight  sum m w            mean   sum m w f / weight
///   second  sum m w^2 (1, d_j, d_j d_k)
///   fourth  sum m w^4 (1, d, d^2, d^3, d^4) for each column
/// Pairwise merge: both sides are shifted to the common mean by the binomial
/// formula; no difference of large sums is formed.
template <std::size_t N>
class mean_sums {
 public:
  static constexpr std::size_t pairs = N * (N + 1) / 2;
  [[nodiscard]] static constexpr std::size_t pair(std::size_t j, std::size_t k) noexcept {
    return j >= k ? j * (j + 1) / 2 + k : k * (k + 1) / 2 + j;
  }

  [[nodiscard]] double weight() const noexcept { return weight_; }
  [[nodiscard]] std::array<double, N> const& mean() const noexcept { return mean_; }

  void add(weighted_view const& view) {
    std::size_t const n = view.weights.size();
    if (n == 0) return;
    mean_sums block;
    if (view.counts.empty() && view.groups.empty())
      block.add_plain(view);
    else
      block.add_counted(view);
    *this += block;
  }

  void rescale(double factor) {
    double const square = factor * factor, fourth = square * square;
    weight_ *= factor;
    second_ *= square;
    fourth_ *= fourth;
    for (double& each : second_1_) each *= square;
    for (double& each : second_2_) each *= square;
    for (auto& each : fourth_n_)
      for (double& power : each) power *= fourth;
    groups_.for_each([&](auto& sums) {
      for (double& each : sums) each *= factor;
    });
  }

  mean_sums& operator+=(mean_sums const& other) {
    if (other.second_ == 0.0 && other.weight_ == 0.0 && other.groups_.empty()) return *this;
    if (second_ == 0.0 && weight_ == 0.0 && groups_.empty()) return *this = other;
    double const total = weight_ + other.weight_;
    mean_sums right = other;
    std::array<double, N> centre{};
    for (std::size_t k = 0; k < N; ++k)
      centre[k] = total > 0.0 ? mean_[k] + (other.mean_[k] - mean_[k]) * (other.weight_ / total) : mean_[k];
    move_to(centre);
    right.move_to(centre);
    weight_ = total;
    second_ += right.second_;
    fourth_ += right.fourth_;
    for (std::size_t k = 0; k < N; ++k) {
      second_1_[k] += right.second_1_[k];
      for (std::size_t p = 0; p < 4; ++p) fourth_n_[k][p] += right.fourth_n_[k][p];
    }
    for (std::size_t q = 0; q < pairs; ++q) second_2_[q] += right.second_2_[q];
    groups_ += right.groups_;
    return *this;
  }

  /// sum over units of u_j u_k, with u normalised by the total weight.
  [[nodiscard]] double product(std::size_t j, std::size_t k, run_facts const& facts) const {
    double const scale = weight_ > 0.0 ? 1.0 / weight_ : 0.0;
    if (facts.groups > 0.0) {
      double sum = 0.0;
      for (std::size_t g = 0; g < groups_.size(); ++g)
        sum += (groups_[g][j + 1] * scale) * (groups_[g][k + 1] * scale);
      return sum;
    }
    return second_2_[pair(j, k)] * scale * scale;
  }

  [[nodiscard]] error_terms terms(std::size_t k, run_facts const& facts) const {
    double const scale = weight_ > 0.0 ? 1.0 / weight_ : 0.0;
    error_terms terms;
    if (facts.groups > 0.0) {
      for (std::size_t g = 0; g < groups_.size(); ++g) {
        double const u = groups_[g][k + 1] * scale, square = u * u;
        terms.sum_squares += square;
        terms.sum_fourth += square * square;
        terms.largest_square = std::max(terms.largest_square, square);
      }
      return terms;
    }
    double const square = scale * scale;
    terms.sum_squares = second_2_[pair(k, k)] * square;
    terms.sum_fourth = fourth_n_[k][3] * square * square;
    return terms;
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.weight_, self.mean_, self.second_, self.second_1_, self.second_2_, self.fourth_,
                                   self.fourth_n_),
                          group_sums<N + 1>::fields(self.groups_));
  }

 private:
  /// Entries that stand for one sample each and have no groups: the vector kernels.
  void add_plain(weighted_view const& view) {
    std::size_t const n = view.weights.size();
    for (std::size_t k = 0; k < N; ++k) {
      std::span<double const> const f = view.values.subspan(k * n, n);
      double firsts[2], powers[8];
      sum_block<block_sums::first>(f, view.weights, f[0], f[0], 0.0, firsts);
      weight_ = firsts[0];
      mean_[k] = weight_ > 0.0 ? f[0] + firsts[1] / weight_ : f[0];
      sum_block<block_sums::powers>(f, view.weights, mean_[k], mean_[k], 0.0, powers);
      second_ = powers[0];
      second_1_[k] = powers[1];
      second_2_[pair(k, k)] = powers[2];
      fourth_ = powers[3];
      for (std::size_t p = 0; p < 4; ++p) fourth_n_[k][p] = powers[4 + p];
    }
    if constexpr (N > 1)
      for (std::size_t i = 0; i < n; ++i) {
        double const w2 = view.weights[i] * view.weights[i];
        for (std::size_t k = 1; k < N; ++k) {
          double const wd = w2 * (view.values[k * n + i] - mean_[k]);
          for (std::size_t j = 0; j < k; ++j) second_2_[pair(k, j)] += wd * (view.values[j * n + i] - mean_[j]);
        }
      }
  }
  void add_counted(weighted_view const& view) {
    std::size_t const n = view.weights.size();
    for (std::size_t i = 0; i < n; ++i) weight_ += view.count(i) * view.weights[i];
    for (std::size_t k = 0; k < N; ++k) {
      double const* const f = view.values.data() + k * n;
      double const first = f[0];
      double sum = 0.0;
      for (std::size_t i = 0; i < n; ++i) sum += view.count(i) * view.weights[i] * (f[i] - first);
      mean_[k] = weight_ > 0.0 ? first + sum / weight_ : first;
    }
    std::array<double, N> d{};
    for (std::size_t i = 0; i < n; ++i) {
      double const w = view.weights[i], w2 = view.count(i) * (w * w), w4 = w2 * (w * w);
      second_ += w2;
      fourth_ += w4;
      for (std::size_t k = 0; k < N; ++k) {
        d[k] = view.values[k * n + i] - mean_[k];
        double const d2 = d[k] * d[k];
        second_1_[k] += w2 * d[k];
        fourth_n_[k][0] += w4 * d[k];
        fourth_n_[k][1] += w4 * d2;
        fourth_n_[k][2] += w4 * (d2 * d[k]);
        fourth_n_[k][3] += w4 * (d2 * d2);
        for (std::size_t j = 0; j <= k; ++j) second_2_[pair(k, j)] += w2 * (d[k] * d[j]);
      }
      if (!view.groups.empty()) {
        std::array<double, N + 1> terms{};
        terms[0] = view.count(i) * w;
        for (std::size_t k = 0; k < N; ++k) terms[k + 1] = terms[0] * d[k];
        groups_.push(view.groups[i], terms);
      }
    }
    groups_.settle();
  }

  void move_to(std::array<double, N> const& centre) {
    std::array<double, N> shift{};
    for (std::size_t k = 0; k < N; ++k) shift[k] = mean_[k] - centre[k];
    for (std::size_t k = 0; k < N; ++k)
      for (std::size_t j = 0; j <= k; ++j)
        second_2_[pair(k, j)] += shift[k] * second_1_[j] + shift[j] * second_1_[k] + shift[k] * shift[j] * second_;
    for (std::size_t k = 0; k < N; ++k) {
      double const s = shift[k];
      auto& p = fourth_n_[k];
      p[3] += s * (4.0 * p[2] + s * (6.0 * p[1] + s * (4.0 * p[0] + s * fourth_)));
      p[2] += s * (3.0 * p[1] + s * (3.0 * p[0] + s * fourth_));
      p[1] += s * (2.0 * p[0] + s * fourth_);
      p[0] += s * fourth_;
      second_1_[k] += s * second_;
    }
    groups_.for_each([&](auto& sums) {
      for (std::size_t k = 0; k < N; ++k) sums[k + 1] += shift[k] * sums[0];
    });
    mean_ = centre;
  }

  double weight_ = 0.0;
  std::array<double, N> mean_{};
  double second_ = 0.0;
  std::array<double, N> second_1_{};
  std::array<double, pairs> second_2_{};
  double fourth_ = 0.0;
  std::array<std::array<double, 4>, N> fourth_n_{};
  group_sums<N + 1> groups_;
};

}  // namespace steelyard::inline v1::detail
