// SPDX-License-Identifier: BSL-1.0
#pragma once

// The test kit for downstream projects: checks with a stated false-alarm rate. Needs Boost.Math.

#include <steelyard/proof/agrees.hpp>
#include <steelyard/proof/calibration.hpp>
#include <steelyard/proof/check.hpp>
#include <steelyard/proof/closed_forms.hpp>
#include <steelyard/proof/coverage.hpp>
#include <steelyard/proof/instrument_check.hpp>
#include <steelyard/proof/linear_normal.hpp>
#include <steelyard/proof/progress.hpp>
#include <steelyard/proof/self_check.hpp>
#include <steelyard/proof/unbiased_resampling.hpp>
