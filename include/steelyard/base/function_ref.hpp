// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <memory>
#include <type_traits>

namespace steelyard::inline v1::detail {

template <class Signature>
class function_ref;

/// A callable lent for the time of a call. What takes one is compiled once, whatever it is lent.
/// @pre the callable outlives its use
template <class R, class... Args>
class function_ref<R(Args...)> {
 public:
  template <class F>
    requires(!std::is_same_v<std::remove_cvref_t<F>, function_ref> && std::is_invocable_r_v<R, F const&, Args...>)
  function_ref(F const& f) noexcept  // NOLINT: implicit on purpose
      : object_(std::addressof(f)), call_([](void const* object, Args... args) -> R {
          return (*static_cast<F const*>(object))(static_cast<Args>(args)...);
        }) {}

  R operator()(Args... args) const { return call_(object_, static_cast<Args>(args)...); }

 private:
  void const* object_;
  R (*call_)(void const*, Args...);
};

}  // namespace steelyard::inline v1::detail
