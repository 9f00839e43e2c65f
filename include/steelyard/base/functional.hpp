// SPDX-License-Identifier: BSL-1.0
#pragma once

// std::function and calls through pointers to members. libstdc++ keeps them
// apart from the searchers of <functional>, whose hash tables would add 5700
// preprocessed lines that nothing here uses.
#if __has_include(<bits/std_function.h>) && __has_include(<bits/invoke.h>)
#include <bits/invoke.h>
#include <bits/std_function.h>
#define STEELYARD_DETAIL_INVOKE std::__invoke
#else
#include <functional>
#define STEELYARD_DETAIL_INVOKE std::invoke
#endif

#include <type_traits>
#include <utility>

namespace steelyard::inline v1::detail {

/// As std::invoke.
template <class F, class... Args>
constexpr std::invoke_result_t<F, Args...> call(F&& f, Args&&... args) {
  return STEELYARD_DETAIL_INVOKE(std::forward<F>(f), std::forward<Args>(args)...);
}

}  // namespace steelyard::inline v1::detail

#undef STEELYARD_DETAIL_INVOKE
