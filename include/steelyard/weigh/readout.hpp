// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string>
#include <string_view>
#include <type_traits>
#include <utility>

#include <steelyard/base/functional.hpp>
#include <steelyard/weigh/callable.hpp>

namespace steelyard::inline v1 {

/// A readout with a name and a unit, for reports and findings.
///   sy::readout{"level", "m", &tank::level}
template <class F>
class readout {
 public:
  readout(std::string name, std::string unit, F f) : name_(std::move(name)), unit_(std::move(unit)), f_(std::move(f)) {}

  [[nodiscard]] std::string_view name() const noexcept { return name_; }
  [[nodiscard]] std::string_view unit() const noexcept { return unit_; }

  template <class State>
    requires std::is_invocable_v<F const&, State const&>
  decltype(auto) operator()(State const& state) const {
    return detail::call(f_, state);
  }

  [[nodiscard]] auto worker_instance() const
    requires detail::per_worker_callable<F>
  {
    return steelyard::readout(name_, unit_, f_.worker_instance());
  }

 private:
  std::string name_;
  std::string unit_;
  F f_;
};

}  // namespace steelyard::inline v1
