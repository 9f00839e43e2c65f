// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>

namespace steelyard::inline v1 {

/// What a stream of random words is drawn for: counter word 2 of Philox, so
/// that no two uses of one seed ever share a word. This is the one table;
/// numbers are never changed or reused, new purposes are only appended.
enum class purpose : std::uint64_t {
  run = 0,          ///< the user's sampler; stream = sample index
  resample = 1,     ///< resampling from kept weights
  merge = 2,        ///< one-pass resampling; stream = first block of the tree node
  move = 3,         ///< moves on recorded words; stream = chain
  prediction = 4,   ///< readings faked for states already weighed
  ensemble = 5,     ///< order and ties of an ensemble
  calibration = 6,  ///< truths and readings of a calibration study
  check = 7,        ///< which samples a run replays to check the sampler
  randomise = 8     ///< shifts and scrambles of low-discrepancy words; stream = replicate
};

}  // namespace steelyard::inline v1
