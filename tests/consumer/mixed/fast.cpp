// SPDX-License-Identifier: BSL-1.0
#include "parts.hpp"

#ifndef __FAST_MATH__
#error "this file is the one with -ffast-math"
#endif

double fast_sampler(steelyard::draws& draws) {
  (void)draws.normal();
  return draws.uniform(-1.0, 1.0);
}

findings fast_run(double (*sampler)(steelyard::draws&)) {
#include "run_body.hpp"
}
