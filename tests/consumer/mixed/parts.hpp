// SPDX-License-Identifier: BSL-1.0
// What the strict and the fast file both do, compiled in each with its own flags under its own names.
#pragma once

#include <steelyard/steelyard.hpp>

struct findings {
  double mean;            // E[x^2 | reading] of the run
  double standard_error;  // its Monte Carlo error
  double chance;          // P(x > 0 | reading)
  bool sound;             // the verdict
  bool never_seen;        // an event never seen is said to be so
  bool zero_refused;      // no sample with any likelihood is an error
  bool nan_refused;       // a weighter that returns NaN is an error
  bool infinite_refused;  // so is one that returns plus infinity
  double half_impossible; // share of samples of positive weight where half of the states are impossible
};

double strict_sampler(steelyard::draws& draws);
double fast_sampler(steelyard::draws& draws);
findings strict_run(double (*sampler)(steelyard::draws&));
findings fast_run(double (*sampler)(steelyard::draws&));
double not_a_number();
double infinity();
