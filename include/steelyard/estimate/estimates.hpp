// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <iosfwd>
#include <string>

#include <steelyard/estimate/estimate.hpp>

namespace steelyard::inline v1 {

/// N estimates from one sample, with the covariance of their Monte Carlo errors.
template <std::size_t N>
class estimates {
 public:
  estimates() = default;
  estimates(std::array<estimate, N> const& each, std::array<double, N * N> const& covariance)
      : each_(each), covariance_(covariance) {}

  [[nodiscard]] static constexpr std::size_t size() noexcept { return N; }
  [[nodiscard]] estimate const& operator[](std::size_t i) const noexcept { return each_[i]; }
  [[nodiscard]] auto begin() const noexcept { return each_.begin(); }
  [[nodiscard]] auto end() const noexcept { return each_.end(); }

  /// c sum_g u_g,i u_g,j: `covariance(i, i)` is the square of the standard error.
  [[nodiscard]] double covariance(std::size_t i, std::size_t j) const noexcept { return covariance_[i * N + j]; }

 private:
  std::array<estimate, N> each_{};
  std::array<double, N * N> covariance_{};
};

template <std::size_t N>
[[nodiscard]] std::string to_string(estimates<N> const& all) {
  std::string text;
  for (estimate const& each : all) text += (text.empty() ? "" : "\n") + to_string(each);
  return text;
}

template <class Char, class Traits, std::size_t N>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, estimates<N> const& all) {
  return out << to_string(all).c_str();
}

}  // namespace steelyard::inline v1
