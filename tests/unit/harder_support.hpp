// SPDX-License-Identifier: BSL-1.0
#pragma once

// A problem in closed form that tempered runs are tested on.

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <cstddef>

#include <steelyard/tempered.hpp>

namespace harder {

namespace sy = steelyard;

/// d normal deviates, each read as y with standard deviation s: all in closed form.
template <std::size_t D>
struct conjugate {
  static constexpr double y = 0.5;
  double s;

  static std::array<double, D> sampler(sy::draws& draws) {
    std::array<double, D> x{};
    for (double& v : x) v = draws.normal();
    return x;
  }
  sy::log_likelihood operator()(std::array<double, D> const& x) const {
    double q = 0.0;
    for (double const v : x) q += (y - v) * (y - v);
    return sy::log_likelihood{-0.5 * q / (s * s)};
  }
  double mean() const { return y / (1.0 + s * s); }
  double sd() const { return s / std::sqrt(1.0 + s * s); }
  double log_evidence() const {
    return 0.5 * static_cast<double>(D) * (std::log(s * s / (1.0 + s * s)) - y * y / (1.0 + s * s));
  }
};

template <std::size_t D>
double first_of(std::array<double, D> const& x) {
  return x[0];
}

inline void agrees(sy::estimate const& e, double truth) {
  CHECK(e.verdict() == sy::verdict::sound);
  CHECK(std::abs(e.value - truth) <= 5.0 * e.standard_error);
}

}  // namespace harder
