// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cmath>
#include <cstddef>
#include <iosfwd>
#include <span>
#include <string>
#include <utility>

#include <steelyard/estimate/estimator.hpp>
#include <steelyard/estimate/moment_sums.hpp>

namespace steelyard::inline v1 {

/// Mean, standard deviation, skewness and kurtosis of a readout, each with its own error.
///   sd^2 = sum W (f-mu)^2 n/(n-1), n Kish's effective size; skewness m3/m2^1.5 and kurtosis m4/m2^2 (3 for a normal
///   law) of the central moments m_k = sum W (f-mu)^k, no correction for small samples
/// Where every readout is the same, skewness and kurtosis are 0 and `broken`: they are not defined.
struct moments_result {
  estimate mean;
  estimate sd;
  estimate skewness;
  estimate kurtosis;
};

/// Mean, sd, skewness and kurtosis by influence functions, z = (f-mu)/sqrt(m2):
///   sd        W (z^2 - 1) sd / 2
///   skewness  W (z^3 - 3 z - s - 1.5 s (z^2 - 1))
///   kurtosis  W (z^4 - k - 4 s z - 2 k (z^2 - 1))                       [delta method; Serfling 1980, ch. 6]
/// Assumes finite moments of twice that order; carriers tell where one entry makes them.
template <class Readout>
class moments_estimator {
 public:
  static constexpr bool own_error = true;
  static constexpr std::size_t columns = 1;

  explicit moments_estimator(Readout its_readout) : readout_(std::move(its_readout)) {}

  [[nodiscard]] Readout const& readout() const noexcept { return readout_; }
  [[nodiscard]] moments_estimator fresh() const { return moments_estimator(readout_); }

  void add(std::span<double const> values, std::span<double const>, weighted_view const& view) {
    sums_.add(view, [&](std::size_t) { return std::array{values.data()}; });
  }
  void rescale(double factor) { sums_.rescale(factor); }
  moments_estimator& operator+=(moments_estimator const& other) {
    sums_ += other.sums_;
    return *this;
  }

  [[nodiscard]] moments_result answer(run_facts const& facts) const {
    auto const all = sums_.centred();
    double const m2 = all.moment(2), size = facts.effective_size();
    moments_result result;
    result.mean = estimate(all.mean(), all.terms({0.0, all.scale()}, facts), facts);
    if (!(m2 > 0.0) || !(size > 1.0)) {
      result.sd = result.skewness = result.kurtosis = estimate(0.0, {}, facts);
      return result;
    }
    double const root = std::sqrt(m2), sd = all.scale() * root * std::sqrt(size / (size - 1.0));
    double const s = all.moment(3) / (m2 * root), k = all.moment(4) / (m2 * m2);
    double const z = 1.0 / root, z2 = 1.0 / m2;
    result.sd = estimate(sd, all.terms({-0.5 * sd, 0.0, 0.5 * sd * z2}, facts), facts);
    result.skewness = estimate(s, all.terms({0.5 * s, -3.0 * z, -1.5 * s * z2, z * z2}, facts), facts);
    result.kurtosis = estimate(k, all.terms({k, -4.0 * s * z, -2.0 * k * z2, 0.0, z2 * z2}, facts), facts);
    return result;
  }

  template <class Self>
  static auto fields(Self& self) {
    return detail::moment_sums<1, 4>::fields(self.sums_);
  }

 private:
  Readout readout_;
  detail::moment_sums<1, 4> sums_;
};

/// Mean, standard deviation, skewness and kurtosis of a scalar readout.
template <class Readout>
[[nodiscard]] auto moments(Readout readout) {
  return moments_estimator<Readout>(std::move(readout));
}

[[nodiscard]] inline std::string to_string(moments_result const& m) {
  return "mean " + to_string(m.mean) + "\nsd " + to_string(m.sd) + "\nskewness " + to_string(m.skewness) +
         "\nkurtosis " + to_string(m.kurtosis);
}

template <class Char, class Traits>
std::basic_ostream<Char, Traits>& operator<<(std::basic_ostream<Char, Traits>& out, moments_result const& m) {
  return out << to_string(m).c_str();
}

}  // namespace steelyard::inline v1
