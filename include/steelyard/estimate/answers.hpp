// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <tuple>
#include <utility>

#include <steelyard/estimate/diagnosis.hpp>

namespace steelyard::inline v1 {

/// The answers to several questions asked of one sample, in the order asked:
/// works with structured bindings, and carries the diagnosis.
template <class... As>
class answers {
 public:
  answers(std::tuple<As...> each, steelyard::diagnosis health, std::uint64_t drawn, std::uint64_t calls)
      : each_(std::move(each)), health_(std::move(health)), drawn_(drawn), calls_(calls) {}

  [[nodiscard]] steelyard::diagnosis const& diagnosis() const noexcept { return health_; }
  /// Samples drawn, failed runs included.
  [[nodiscard]] std::uint64_t drawn() const noexcept { return drawn_; }
  /// Calls of the sampler, replays included.
  [[nodiscard]] std::uint64_t sampler_calls() const noexcept { return calls_; }
  [[nodiscard]] static constexpr std::size_t size() noexcept { return sizeof...(As); }

  template <std::size_t I>
  [[nodiscard]] auto const& get() const& noexcept {
    return std::get<I>(each_);
  }
  template <std::size_t I>
  [[nodiscard]] auto&& get() && noexcept {
    return std::get<I>(std::move(each_));
  }

 private:
  std::tuple<As...> each_;
  steelyard::diagnosis health_;
  std::uint64_t drawn_;
  std::uint64_t calls_;
};

}  // namespace steelyard::inline v1

template <class... As>
struct std::tuple_size<steelyard::answers<As...>> : std::integral_constant<std::size_t, sizeof...(As)> {};
template <std::size_t I, class... As>
struct std::tuple_element<I, steelyard::answers<As...>> {
  using type = std::tuple_element_t<I, std::tuple<As...>>;
};
