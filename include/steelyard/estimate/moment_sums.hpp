// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <tuple>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/bits.hpp>
#include <steelyard/base/kernels.hpp>
#include <steelyard/base/monomial_lanes.hpp>
#include <steelyard/estimate/estimate.hpp>
#include <steelyard/estimate/group_sums.hpp>
#include <steelyard/estimate/run_facts.hpp>

namespace steelyard::inline v1::detail {

/// Polynomials of one or two variables up to a total degree, by their
/// coefficients: x^a y^b has place a, or (a+b)(a+b+1)/2 + b.
template <std::size_t Vars>
struct monomials {
  static constexpr std::size_t count(std::size_t degree) noexcept {
    return Vars == 1 ? degree + 1 : (degree + 1) * (degree + 2) / 2;
  }
  static constexpr std::size_t place(std::size_t a, std::size_t b) noexcept {
    return Vars == 1 ? a : (a + b) * (a + b + 1) / 2 + b;
  }
  /// act(a, b) for each monomial up to the degree.
  template <class Act>
  static constexpr void each(std::size_t degree, Act act) {
    for (std::size_t b = 0; b <= (Vars == 1 ? 0 : degree); ++b)
      for (std::size_t a = 0; a + b <= degree; ++a) act(a, b);
  }
};

/// Weighted power sums of P sets of one or two columns about their running
/// means, enough for the error bar of anything whose influence is a polynomial q of degree D in a set:
///   first  sum m w t^k, k <= D    second  sum m w^2 t^k, k <= 2D    fourth  sum m w^4 t^k, k <= 4D
/// with t = (f - centre) / scale and scale a power of two no less than the largest |f - centre|, so that no power
/// overflows. Parts merge by the binomial formula about the common mean; no difference of large sums is formed.
template <std::size_t Vars, std::size_t Degree, std::size_t P = 1>
class moment_sums {
  using shape = monomials<Vars>;

 public:
  static constexpr std::size_t terms_count = shape::count(Degree);
  using polynomial = std::array<double, terms_count>;
  using columns = std::array<double const*, Vars>;
  static constexpr std::size_t place(std::size_t a, std::size_t b = 0) noexcept { return shape::place(a, b); }

  /// of_set(k): where the columns of set k begin, view.weights.size() entries each.
  template <class OfSet>
  void add(weighted_view const& view, OfSet of_set) {
    std::size_t const n = view.weights.size();
    if (n == 0) return;
    moment_sums block;
    double weight = 0.0;
    for (std::size_t i = 0; i < n; ++i) weight += view.count(i) * view.weights[i];
    std::vector<std::array<double, P * terms_count>> of_entry(view.groups.empty() ? 0 : n);
    for (std::size_t k = 0; k < P; ++k) {
      columns const f = of_set(k);
      power_sums& sums = block.sets_[k];
      for (std::size_t v = 0; v < Vars; ++v) {
        double sum = 0.0, reach = 0.0;
        for (std::size_t i = 0; i < n; ++i) sum += view.count(i) * view.weights[i] * (f[v][i] - f[v][0]);
        sums.centre[v] = weight > 0.0 ? f[v][0] + sum / weight : f[v][0];
        for (std::size_t i = 0; i < n; ++i) reach = std::max(reach, std::abs(f[v][i] - sums.centre[v]));
        sums.scale[v] = power_above(reach);
      }
      add_powers_of(sums, view, f, [&](std::size_t i, double const(&t)[Vars], double mw) {
        if (of_entry.empty()) return;
        shape::each(Degree, [&](std::size_t a, std::size_t b) {
          double term = mw;
          for (std::size_t p = 0; p < a; ++p) term *= t[0];
          for (std::size_t p = 0; p < b; ++p) term *= t[Vars - 1];
          of_entry[i][k * terms_count + shape::place(a, b)] = term;
        });
      });
    }
    for (std::size_t i = 0; i < of_entry.size(); ++i) block.groups_.push(view.groups[i], of_entry[i]);
    block.groups_.settle();
    *this += block;
  }

  void rescale(double factor) {
    double const square = factor * factor;
    for (power_sums& set : sets_) {
      for (double& each : set.first) each *= factor;
      for (double& each : set.second) each *= square;
      for (double& each : set.fourth) each *= square * square;
    }
    groups_.for_each([&](auto& sums) {
      for (double& each : sums) each *= factor;
    });
  }

  moment_sums& operator+=(moment_sums const& other) {
    if (other.empty()) return *this;
    if (empty()) return *this = other;
    double const total = sets_[0].first[0] + other.sets_[0].first[0];
    moment_sums right = other;
    for (std::size_t k = 0; k < P; ++k) {
      power_sums& left_set = sets_[k];
      power_sums& right_set = right.sets_[k];
      for (std::size_t v = 0; v < Vars; ++v) {
        double const gap = right_set.centre[v] - left_set.centre[v];
        double const centre =
            total > 0.0 ? left_set.centre[v] + gap * (right_set.first[0] / total) : left_set.centre[v];
        double const scale = std::max(std::max(left_set.scale[v], right_set.scale[v]), power_above(std::abs(gap)));
        move_to(k, v, centre, scale);
        right.move_to(k, v, centre, scale);
      }
      for (std::size_t p = 0; p < left_set.first.size(); ++p) left_set.first[p] += right_set.first[p];
      for (std::size_t p = 0; p < left_set.second.size(); ++p) left_set.second[p] += right_set.second[p];
      for (std::size_t p = 0; p < left_set.fourth.size(); ++p) left_set.fourth[p] += right_set.fourth[p];
    }
    groups_ += right.groups_;
    return *this;
  }

  /// About the exact means, which each column's sum of t then says.
  [[nodiscard]] moment_sums centred() const {
    moment_sums last = *this;
    for (std::size_t k = 0; k < P; ++k)
      for (std::size_t v = 0; v < Vars; ++v)
        last.move_to(k, v, mean(v, k) + scale(v, k) * moment(v == 0 ? 1 : 0, v == 0 ? 0 : 1, k), scale(v, k));
    return last;
  }
  [[nodiscard]] double mean(std::size_t v = 0, std::size_t k = 0) const noexcept { return sets_[k].centre[v]; }
  [[nodiscard]] double scale(std::size_t v = 0, std::size_t k = 0) const noexcept { return sets_[k].scale[v]; }
  /// sum W t_x^a t_y^b of set k, W normalised.
  [[nodiscard]] double moment(std::size_t a, std::size_t b = 0, std::size_t k = 0) const noexcept {
    auto const& first = sets_[k].first;
    return first[0] > 0.0 ? first[shape::place(a, b)] / first[0] : 0.0;
  }

  /// Terms of the error bar of u = W q(t) in set k. What is below the rounding of its parts counts as zero.
  [[nodiscard]] error_terms terms(polynomial const& q, run_facts const& facts, std::size_t k = 0) const {
    error_terms result;
    power_sums const& set = sets_[k];
    if (!(set.first[0] > 0.0)) return result;
    double const scale = 1.0 / set.first[0], square = scale * scale;
    if (facts.groups > 0.0) {
      for (std::size_t g = 0; g < groups_.size(); ++g) {
        double const u = dot(q, groups_[g].data() + k * terms_count) * scale;
        result.sum_squares += u * u;
        result.sum_fourth += (u * u) * (u * u);
        result.largest_square = std::max(result.largest_square, u * u);
      }
      return result;
    }
    auto const q2 = times_itself<Degree>(q);
    result.sum_squares = std::max(0.0, dot(q2, set.second.data())) * square;
    result.sum_fourth = std::max(0.0, dot(times_itself<2 * Degree>(q2), set.fourth.data())) * square * square;
    return result;
  }

  template <class Self>
  static auto fields(Self& self) {
    return std::tuple_cat(std::tie(self.sets_), group_sums<P * terms_count>::fields(self.groups_));
  }

 private:
  struct power_sums {
    std::array<double, Vars> centre{}, scale{};
    polynomial first{};
    std::array<double, shape::count(2 * Degree)> second{};
    std::array<double, shape::count(4 * Degree)> fourth{};
  };

  /// The sums of one set over its entries, about its centre; each(i, t, m w) is called for every entry.
  template <class Each>
  static void add_powers_of(power_sums& sums, weighted_view const& view, columns const& f, Each each) {
    constexpr std::size_t run = 128, eights = shape::count(Degree) + shape::count(2 * Degree) + shape::count(4 * Degree);
    double t[Vars][run], of_first[run], of_second[run], of_fourth[run], lanes[eights * virtual_lanes] = {};
    double* const second = lanes + shape::count(Degree) * virtual_lanes;
    double* const fourth = second + shape::count(2 * Degree) * virtual_lanes;
    double per_scale[Vars];
    for (std::size_t v = 0; v < Vars; ++v) per_scale[v] = sums.scale[v] > 0.0 ? 2.0 / sums.scale[v] : 0.0;
    for (std::size_t first = 0; first < view.weights.size(); first += run) {
      std::size_t const n = std::min(run, view.weights.size() - first), groups = (n + virtual_lanes - 1) / virtual_lanes;
      for (std::size_t i = n; i < groups * virtual_lanes; ++i) {
        for (std::size_t v = 0; v < Vars; ++v) t[v][i] = 0.0;
        of_first[i] = of_second[i] = of_fourth[i] = 0.0;
      }
      for (std::size_t i = 0; i < n; ++i) {
        double of_one[Vars];
        for (std::size_t v = 0; v < Vars; ++v) of_one[v] = t[v][i] = times(0.5 * (f[v][first + i] - sums.centre[v]), per_scale[v]);
        double const w = view.weights[first + i], mw = view.count(first + i) * w;
        of_first[i] = mw;
        of_second[i] = mw * w;
        of_fourth[i] = mw * w * (w * w);
        each(first + i, of_one, mw);
      }
      sum_monomials<Vars, Degree>(t[0], t[Vars - 1], of_first, groups, lanes);
      sum_monomials<Vars, 2 * Degree>(t[0], t[Vars - 1], of_second, groups, second);
      sum_monomials<Vars, 4 * Degree>(t[0], t[Vars - 1], of_fourth, groups, fourth);
    }
    for (std::size_t p = 0; p < sums.first.size(); ++p) sums.first[p] = lane_total(lanes + p * virtual_lanes);
    for (std::size_t p = 0; p < sums.second.size(); ++p) sums.second[p] = lane_total(second + p * virtual_lanes);
    for (std::size_t p = 0; p < sums.fourth.size(); ++p) sums.fourth[p] = lane_total(fourth + p * virtual_lanes);
  }

  [[nodiscard]] bool empty() const noexcept {
    return sets_[0].first[0] == 0.0 && sets_[0].second[0] == 0.0 && groups_.empty();
  }

  /// The least power of two above x > 0; 0 for 0.
  static double power_above(double x) noexcept {
    if (!(x > 0.0)) return 0.0;
    auto const exponent = static_cast<std::int64_t>(std::bit_cast<std::uint64_t>(x) >> 52) - 1022;
    return power_of_two(exponent > 1023 ? 1023 : exponent);
  }

  /// What becomes of sums when t of variable v becomes c t + s.
  static void change(double* sums, std::size_t degree, std::size_t v, double c, double s) {
    auto const at = [v](std::size_t a, std::size_t b) { return v == 0 ? shape::place(a, b) : shape::place(b, a); };
    for (std::size_t b = 0; b <= (Vars == 1 ? 0 : degree); ++b) {
      double factor = 1.0;
      for (std::size_t a = 1; a + b <= degree; ++a) sums[at(a, b)] *= factor *= c;
      for (std::size_t k = 1; k + b <= degree && s != 0.0; ++k)
        for (std::size_t a = degree - b; a >= k; --a) sums[at(a, b)] += s * sums[at(a - 1, b)];
    }
  }
  void move_to(std::size_t k, std::size_t v, double centre, double scale) {
    power_sums& set = sets_[k];
    double const c = scale > 0.0 ? set.scale[v] / scale : 0.0;
    double const s = scale > 0.0 ? (set.centre[v] - centre) / scale : 0.0;
    change(set.first.data(), Degree, v, c, s);
    change(set.second.data(), 2 * Degree, v, c, s);
    change(set.fourth.data(), 4 * Degree, v, c, s);
    groups_.for_each([&](auto& sums) { change(sums.data() + k * terms_count, Degree, v, c, s); });
    set.centre[v] = centre;
    set.scale[v] = scale;
  }

  template <std::size_t D>
  static std::array<double, shape::count(2 * D)> times_itself(std::array<double, shape::count(D)> const& q) {
    std::array<double, shape::count(2 * D)> square{};
    shape::each(D, [&](std::size_t a, std::size_t b) {
      shape::each(D, [&](std::size_t c, std::size_t d) {
        square[shape::place(a + c, b + d)] += q[shape::place(a, b)] * q[shape::place(c, d)];
      });
    });
    return square;
  }
  template <std::size_t N>
  static double dot(std::array<double, N> const& q, double const* sums) noexcept {
    double sum = 0.0, size = 0.0;
    for (std::size_t p = 0; p < N; ++p) {
      sum += q[p] * sums[p];
      size += std::abs(q[p] * sums[p]);
    }
    return std::abs(sum) > 256.0 * std::numeric_limits<double>::epsilon() * size ? sum : 0.0;
  }

  std::vector<power_sums> sets_ = std::vector<power_sums>(P);
  group_sums<P * terms_count> groups_;
};

}  // namespace steelyard::inline v1::detail
