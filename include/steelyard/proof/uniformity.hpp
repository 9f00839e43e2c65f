// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/proof/chances.hpp>

namespace steelyard::inline v1::proof {

/// What the positions of true values among draws say of a model.
struct uniformity {
  double chi_square = 0.0;      ///< over bins of equal width
  double degrees = 0.0;
  double chi_square_chance = 0.0;
  bool left_envelope = false;   ///< cumulative counts outside their exact envelope
  double mean = 0.0;            ///< 1/2 when uniform
  double spread = 0.0;          ///< 12 times the mean square about 1/2; 1 when uniform
  std::string direction;        ///< what the posterior does wrong, in words
};

namespace detail {

/// Mean and spread of positions, and how many standard deviations each is off:
/// under uniformity those are 1/sqrt(12 n) and sqrt(0.8/n).
struct tendency {
  double mean = 0.0, spread = 0.0;
  double shift = 0.0, width = 0.0;

  template <class Positions>
  explicit tendency(Positions const& positions) {
    double const n = static_cast<double>(positions.size());
    for (double const x : positions) {
      mean += x / n;
      spread += 12.0 * (x - 0.5) * (x - 0.5) / n;
    }
    shift = (mean - 0.5) * std::sqrt(12.0 * n);
    width = (spread - 1.0) * std::sqrt(n / 0.8);
  }
  [[nodiscard]] double largest() const { return std::max(std::abs(shift), std::abs(width)); }
  [[nodiscard]] char const* words() const {
    if (largest() < 3.0) return "neither shifted nor of a wrong width, but of another shape";
    if (std::abs(shift) >= std::abs(width))
      return shift > 0.0 ? "shifted: it lies below the truth too often" : "shifted: it lies above the truth too often";
    return width > 0.0 ? "too narrow: the truth lies in its tails too often"
                       : "too wide: the truth lies near its middle too often";
  }
};

}  // namespace detail

/// Tests numbers in [0, 1] for uniformity.
///   chi-square over `bins` bins, and cumulative counts at the bin edges inside an envelope that uniform numbers
///   leave with at most the stated probability, computed exactly. Each has half the rate.
/// @pre  bins >= 2, at least one number, 0 < rate < 1
inline uniformity test_uniform(std::span<double const> numbers, std::size_t bins, double rate) {
  std::vector<std::uint64_t> counts(bins);
  double const n = static_cast<double>(numbers.size());
  for (double const x : numbers) ++counts[std::min(bins - 1, static_cast<std::size_t>(x * static_cast<double>(bins)))];
  uniformity u;
  double const expected = n / static_cast<double>(bins);
  for (std::uint64_t const c : counts)
    u.chi_square += (static_cast<double>(c) - expected) * (static_cast<double>(c) - expected) / expected;
  u.degrees = static_cast<double>(bins - 1);
  u.chi_square_chance = detail::chi_square_upper(u.chi_square, u.degrees);
  detail::envelope const limits = detail::exact_envelope(numbers.size(), bins, 0.5 * rate);
  std::uint64_t sum = 0;
  for (std::size_t k = 0; k + 1 < bins; ++k) {
    sum += counts[k];
    u.left_envelope = u.left_envelope || sum < limits.lower[k] || sum > limits.upper[k];
  }
  detail::tendency const is(numbers);
  u.mean = is.mean;
  u.spread = is.spread;
  u.direction = is.words();
  return u;
}

}  // namespace steelyard::inline v1::proof
