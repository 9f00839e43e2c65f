// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <array>
#include <cstddef>
#include <stdexcept>
#include <string>
#include <vector>

#include "statistics/exact.hpp"
#include "statistics/sources.hpp"

// Problems whose answers are known exactly, one line each in support/problems.cpp. All invented, but for the two with a source.

namespace known {

struct problem {
  std::string name;
  source from;
  posterior exact;
  double tail = 0.1;     ///< the event asked for: x above its quantile at 1 - tail
  bool typical = false;  ///< in the short run at every size
};

inline constexpr std::array<std::size_t, 3> sizes{300, 2'000, 10'000};

std::vector<problem> const& problems();

/// The problem of that name; no other name is an answer.
inline problem const& of(std::string const& name) {
  for (problem const& p : problems())
    if (p.name == name) return p;
  throw std::runtime_error("there is no problem called " + name);
}

}  // namespace known
