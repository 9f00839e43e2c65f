// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstdint>
#include <cstdio>
#include <functional>
#include <mutex>
#include <string>
#include <utility>

#include <steelyard/base/chrono.hpp>

namespace steelyard::inline v1::proof {

/// Called while a long check runs, by one thread at a time: so many of its repeats are done.
using progress = std::function<void(std::uint64_t done, std::uint64_t repeats)>;

/// A line on standard error, for checks that take longer than two seconds: rewritten twice a second, and ended.
///   proof::calibration(..., {.progress = proof::progress_line("tank model")})
[[nodiscard]] inline progress progress_line(std::string what = "check", std::FILE* to = stderr) {
  using clock = std::chrono::steady_clock;
  return [what = std::move(what), to, next = clock::now() + std::chrono::seconds(2), shown = false](
             std::uint64_t done, std::uint64_t repeats) mutable {
    auto const now = clock::now();
    if (now < next && !(shown && done == repeats)) return;
    next = now + std::chrono::milliseconds(500);
    shown = true;
    std::fprintf(to, "\r%s: %llu of %llu repeats%s", what.c_str(), static_cast<unsigned long long>(done),
                 static_cast<unsigned long long>(repeats), done == repeats ? "\n" : "");
    std::fflush(to);
  };
}

namespace detail {

/// Counts repeats done on any threads, and hands the number on.
class repeat_counter {
 public:
  repeat_counter(progress const& to, std::uint64_t repeats) : to_(to), repeats_(repeats) {}
  void add(std::uint64_t n) {
    if (!to_) return;
    std::lock_guard const lock(mutex_);
    done_ += n;
    to_(done_, repeats_);
  }

 private:
  progress const& to_;
  std::uint64_t repeats_, done_ = 0;
  std::mutex mutex_;
};

}  // namespace detail

}  // namespace steelyard::inline v1::proof
