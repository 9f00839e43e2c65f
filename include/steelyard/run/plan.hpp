// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <memory>
#include <stop_token>

#include <steelyard/base/chrono.hpp>
#include <steelyard/base/count.hpp>
#include <steelyard/base/executor.hpp>
#include <steelyard/base/functional.hpp>
#include <steelyard/draw/words.hpp>
#include <steelyard/run/checkpoint_sink.hpp>
#include <steelyard/sample/origin.hpp>

namespace steelyard::inline v1 {

/// How far a run is, told at the end of each round.
struct progress_report {
  std::uint64_t drawn = 0;    ///< samples so far, failed runs included
  std::uint64_t planned = 0;  ///< samples in all
  std::uint64_t failed = 0;   ///< runs set aside so far
  std::chrono::nanoseconds elapsed{0};
};

/// How to run: every field has a default.
struct plan {
  count size = 10'000;   ///< samples
  count seed = 1;        ///< the same seed gives the same samples
  unsigned threads = 1;  ///< 0: all cores. Many legacy generators are not safe on several threads
  keeping keep = keeping::states;
  words source = {};                         ///< of random words; independent streams unless given
  failures on_failure = failures::stop;
  std::chrono::nanoseconds time_limit{0};    ///< ends after the round that reaches it; 0: none
  std::function<void(progress_report const&)> progress = {};  ///< called by one thread at a time
  std::stop_token token = {};                ///< ends after the current round
  steelyard::executor executor = {};         ///< instead of threads of our own
  std::shared_ptr<checkpoint_sink> checkpoint = {};
};

}  // namespace steelyard::inline v1
