// SPDX-License-Identifier: BSL-1.0
// The evidence of tempered runs with frozen settings, not its logarithm, is right on average: a short look.

#include <doctest/doctest.h>

#include "statistics/tempered_frozen.hpp"

TEST_CASE("frozen settings: the mean of the evidence over runs is the evidence") {
  auto const z = frozen::evidence_of(200);
  CAPTURE(z.value);
  CAPTURE(z.standard_error);
  CHECK(std::abs(z.value) <= 4.0 * z.standard_error);
  // The runs scatter enough for a bias of the logarithm, half the square of its error, to show.
  CHECK(z.spread > 0.2);
  CHECK(z.standard_error < 0.1);
}
