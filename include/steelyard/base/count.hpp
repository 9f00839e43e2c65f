// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <cstdint>
#include <string>
#include <type_traits>

#include <steelyard/base/error.hpp>

namespace steelyard::inline v1 {

/// A number of things: takes any integer type, signed or not, and refuses
/// negatives, so that `.size = n` works whatever `n` is.
/// @throws bad_argument for a negative value.
class count {
 public:
  constexpr count() noexcept = default;

  template <std::integral Integer>
    requires(!std::same_as<std::remove_cv_t<Integer>, bool>)
  constexpr count(Integer value) : value_(static_cast<std::uint64_t>(value)) {  // NOLINT: implicit on purpose
    if constexpr (std::signed_integral<Integer>)
      if (value < 0)
        throw bad_argument("count: " + std::to_string(static_cast<long long>(value)) +
                           " is negative; a count is zero or more");
  }

  template <class Other>
    requires(!std::integral<Other> || std::same_as<std::remove_cv_t<Other>, bool>)
  count(Other) = delete;  // a fraction or a truth value is no count

  constexpr operator std::uint64_t() const noexcept { return value_; }  // NOLINT: implicit on purpose
  [[nodiscard]] constexpr std::uint64_t value() const noexcept { return value_; }

 private:
  std::uint64_t value_ = 0;
};

}  // namespace steelyard::inline v1
