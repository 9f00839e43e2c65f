// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <concepts>
#include <type_traits>

#include <steelyard/sample/front_door.hpp>
#include <steelyard/weigh/concepts.hpp>
#include <steelyard/weigh/itemised.hpp>

namespace steelyard::inline v1::detail {

/// Whether a sampler and a weighter make a pipeline. With `Speak`, one sentence
/// says what is wrong, and nothing behind it is instantiated.
template <bool Speak, class Sampler, class Weighter>
consteval bool may_pipe() {
  if constexpr (!callable_v<Sampler, draws&>) {
    constexpr bool changes = only_mutable_v<Sampler, draws&>;
    static_assert(!Speak || !changes,
                  "steelyard: this sampler changes itself when called; samplers are called as const, perhaps from "
                  "several threads: wrap it as sy::per_worker([] { return sampler; })");
    static_assert(!Speak || changes, "steelyard: a sampler is called with draws& (`[](sy::draws& draws) { ... }`) and "
                                     "returns a state; this one cannot be called so");
    return false;
  } else if constexpr (!sampler<Sampler>) {
    static_assert(!Speak || sampler<Sampler>, "steelyard: this sampler returns nothing that can be moved, or a reference to "
                                              "what cannot be copied; it must return a state");
    return false;
  } else {
    using X = state_of_t<Sampler>;
    if constexpr (weighter_for<Weighter, X>) {
      return true;
    } else if constexpr (std::is_convertible_v<result_t<Weighter, X const&>, double>) {
      static_assert(!Speak, "steelyard: this weighter returns a bare number, which could be a density or its logarithm: "
                            "return sy::log_likelihood{...} or sy::likelihood{...}, or wrap it as "
                            "sy::as_log_likelihood(f) or sy::as_likelihood(f)");
      return false;
    } else if constexpr (only_mutable_v<Weighter, X const&>) {
      static_assert(!Speak, "steelyard: this weighter changes itself when called; weighters are called as const, perhaps "
                            "from several threads: wrap it as sy::per_worker([] { return weighter; })");
      return false;
    } else {
      static_assert(!Speak, "steelyard: this weighter cannot weigh what the sampler returns: it is called as const with "
                            "the state and returns log_likelihood or likelihood");
      return false;
    }
  }
}

}  // namespace steelyard::inline v1::detail
