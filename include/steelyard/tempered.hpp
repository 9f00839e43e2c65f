// SPDX-License-Identifier: BSL-1.0
#pragma once

// Sharp readings and low probabilities: the same black box, far fewer runs.

#include <steelyard/core.hpp>
#include <steelyard/harder/low_probability.hpp>
#include <steelyard/harder/run_tempered.hpp>
#include <steelyard/harder/run_until_sound.hpp>
