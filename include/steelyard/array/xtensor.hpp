// SPDX-License-Identifier: BSL-1.0
#pragma once

// xtensor moved its headers into folders at 0.26 and left nothing behind.
#if __has_include(<xtensor/containers/xtensor.hpp>)
#include <xtensor/containers/xadapt.hpp>
#include <xtensor/containers/xfixed.hpp>
#include <xtensor/containers/xtensor.hpp>
#include <xtensor/core/xexpression.hpp>
#else
#include <xtensor/xadapt.hpp>
#include <xtensor/xexpression.hpp>
#include <xtensor/xfixed.hpp>
#include <xtensor/xtensor.hpp>
#endif
