// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <string_view>

namespace steelyard::inline v1 {

/// Whether an error bar can be believed.
enum class verdict {
  sound,     ///< enough terms carry it: its error intervals cover what they claim
  strained,  ///< too few for that: take it as an order of magnitude
  broken,    ///< carried by a handful, or by none: do not use it
};

[[nodiscard]] constexpr std::string_view to_string(verdict v) noexcept {
  return v == verdict::sound ? "sound" : v == verdict::strained ? "strained" : "broken";
}

/// How a sample was drawn, and so what its independent units are.
enum class how_drawn {
  independent,  ///< every sample on its own
  replicated,   ///< a few independent replicates of a balanced set
  lineages,     ///< descendants of independent ancestors, after tempering
  labelled,     ///< the user's own groups
};

}  // namespace steelyard::inline v1
