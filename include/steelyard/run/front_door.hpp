// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1::detail {

/// Whether a sampler draws states. With `Speak`, one sentence says what is wrong.
template <bool Speak, class Sampler>
consteval bool may_draw() {
  if constexpr (!callable_v<Sampler, draws&>) {
    constexpr bool changes = only_mutable_v<Sampler, draws&>;
    static_assert(!Speak || !changes,
                  "steelyard: this sampler changes itself when called; samplers are called as const, perhaps from "
                  "several threads: wrap it as sy::per_worker([] { return sampler; })");
    static_assert(!Speak || !makes_nothing_v<Sampler>,
                  "steelyard: per_worker() takes a factory without arguments that returns the callable: "
                  "sy::per_worker([] { return sampler; })");
    static_assert(!Speak || changes || makes_nothing_v<Sampler>,
                  "steelyard: a sampler is called with draws&, never with a copy of it (`[](sy::draws& draws) { ... }`), "
                  "and returns a state; this one cannot be called so");
    return false;
  } else if constexpr (!sampler<Sampler>) {
    static_assert(!Speak || sampler<Sampler>, "steelyard: this sampler returns nothing, or nothing that can be moved, or a "
                                              "reference to what cannot be copied; it must return a state");
    return false;
  } else {
    return true;
  }
}

}  // namespace steelyard::inline v1::detail
