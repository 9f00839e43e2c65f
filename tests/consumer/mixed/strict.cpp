// SPDX-License-Identifier: BSL-1.0
#include "parts.hpp"

#include <limits>

#ifdef __FAST_MATH__
#error "this file is the strict one"
#endif

double strict_sampler(steelyard::draws& draws) {
  (void)draws.normal();
  return draws.uniform(-1.0, 1.0);
}

double not_a_number() { return std::numeric_limits<double>::quiet_NaN(); }
double infinity() { return std::numeric_limits<double>::infinity(); }

findings strict_run(double (*sampler)(steelyard::draws&)) {
#include "run_body.hpp"
}
