// SPDX-License-Identifier: BSL-1.0
#pragma once

// Questions to readings: which decided, whether they agree, what the next would show.

#include <steelyard/ask/agreement.hpp>
#include <steelyard/ask/decided.hpp>
#include <steelyard/ask/next_reading.hpp>
