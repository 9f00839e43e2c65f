// SPDX-License-Identifier: BSL-1.0
#include "parts.hpp"

#include <cmath>
#include <iostream>

int main() {
  struct {
    char const* name;
    findings (*run)(double (*)(steelyard::draws&));
    double (*sampler)(steelyard::draws&);
  } const cases[] = {{"strict run, strict sampler", strict_run, strict_sampler},
                     {"strict run, fast sampler", strict_run, fast_sampler},
                     {"fast run, strict sampler", fast_run, strict_sampler},
                     {"fast run, fast sampler", fast_run, fast_sampler}};
  findings const first = strict_run(strict_sampler);
  int wrong = 0;
  auto check = [&](char const* name, char const* what, bool good) {
    if (!good) std::cout << name << ": " << what << '\n';
    wrong += good ? 0 : 1;
  };
  for (auto const& [name, run, sampler] : cases) {
    findings const found = run(sampler);
    check(name, "mean", std::abs(found.mean - 0.307856) < 5 * found.standard_error);  // by quadrature
    check(name, "standard error", found.standard_error > 1e-4 && found.standard_error < 1e-2);
    check(name, "chance", std::abs(found.chance - 0.5) < 0.05);
    check(name, "same words, same answer", std::abs(found.mean / first.mean - 1) < 1e-12 &&
                                               std::abs(found.standard_error / first.standard_error - 1) < 1e-9);
    check(name, "verdict", found.sound);
    check(name, "never seen", found.never_seen);
    check(name, "no likelihood is refused", found.zero_refused);
    check(name, "not a number is refused", found.nan_refused);
    check(name, "infinity is refused", found.infinite_refused);
    check(name, "impossible states", std::abs(found.half_impossible - 0.5) < 0.02);  // sd of the share is 0.0022
  }
  std::cout << wrong << " wrong\n";
  return wrong == 0 ? 0 : 1;
}
