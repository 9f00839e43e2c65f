// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <type_traits>
#include <utility>

#include <steelyard/base/functional.hpp>

namespace steelyard::inline v1 {

namespace detail {

/// One worker's own copy of a callable: called as `const`, yet free to use its
/// scratch space, since no other worker sees it.
template <class F>
class own_copy {
 public:
  explicit own_copy(F f) : f_(std::move(f)) {}

  template <class... Args>
    requires std::is_invocable_v<F&, Args...>
  decltype(auto) operator()(Args&&... args) const {
    return detail::call(f_, std::forward<Args>(args)...);
  }

 private:
  mutable F f_;
};

/// True where every worker needs a copy of its own.
template <class F>
concept per_worker_callable = requires(F const& f) { f.worker_instance(); };

/// What a worker calls: `f` itself, or the copy made for it.
template <class F>
struct instance_of {
  using type = F const&;
  static type make(F const& f) noexcept { return f; }
};
template <per_worker_callable F>
struct instance_of<F> {
  using type = decltype(std::declval<F const&>().worker_instance());
  static type make(F const& f) { return f.worker_instance(); }
};
template <class F>
using instance_t = typename instance_of<F>::type;
template <class F>
using called_t = std::remove_reference_t<instance_t<F>> const&;

template <class F, class... Args>
inline constexpr bool callable_v = std::is_invocable_v<called_t<F>, Args...>;
/// A callable that would do if it were not called as `const`.
template <class F, class... Args>
inline constexpr bool only_mutable_v = !callable_v<F, Args...> && std::is_invocable_v<F&, Args...>;

template <bool Callable, class F, class... Args>
struct result_if {
  using type = void;
};
template <class F, class... Args>
struct result_if<true, F, Args...> {
  using type = std::remove_cvref_t<std::invoke_result_t<called_t<F>, Args...>>;
};
/// What a call returns, without reference and const; void where it cannot be called.
template <class F, class... Args>
using result_t = typename result_if<callable_v<F, Args...>, F, Args...>::type;

}  // namespace detail

/// A callable with scratch space or costly set-up: the factory is called once
/// for each worker, and what it returns serves that worker alone. What it keeps
/// between calls must not change results; a run spot-checks that.
///   sy::per_worker([] { return solver{}; })
template <class Factory>
class per_worker {
 public:
  explicit per_worker(Factory factory) : factory_(std::move(factory)) {}

  [[nodiscard]] auto worker_instance() const
    requires std::is_invocable_v<Factory const&>
  {
    return detail::own_copy(factory_());
  }

 private:
  Factory factory_;
};

namespace detail {

/// A callable handed to `per_worker` where a factory that returns it is due.
template <class F>
inline constexpr bool makes_nothing_v = false;
template <class Factory>
inline constexpr bool makes_nothing_v<per_worker<Factory>> = !std::is_invocable_v<Factory const&>;

}  // namespace detail

}  // namespace steelyard::inline v1
