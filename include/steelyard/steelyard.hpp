// SPDX-License-Identifier: BSL-1.0
#pragma once

// The usual door: the core, the instruments and the arrays. Needs Boost.Math and xtensor.

#include <steelyard/array/arrays.hpp>
#include <steelyard/core.hpp>
#include <steelyard/instrument/instruments.hpp>
#include <steelyard/instrument/reading.hpp>
