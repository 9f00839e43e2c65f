// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

#include <steelyard/base/algorithm.hpp>
#include <steelyard/base/executor.hpp>

namespace steelyard::inline v1 {

/// An executor on n threads, the caller's among them; 0: one for each core.
/// Threads live for one call; an exception of a task is thrown to the caller.
[[nodiscard]] inline executor on_threads(unsigned n) {
  if (n == 0) n = std::max(1u, std::thread::hardware_concurrency());
  if (n == 1) return {};
  return executor([n](std::size_t tasks, executor::task const& f) {
    std::atomic<std::size_t> next{0};
    std::mutex mutex;
    std::exception_ptr failure;
    auto const work = [&] {
      try {
        for (std::size_t i = next++; i < tasks; i = next++) f(i);
      } catch (...) {
        std::lock_guard const lock(mutex);
        if (!failure) failure = std::current_exception();
      }
    };
    {
      std::vector<std::jthread> helpers;
      for (std::size_t t = 1; t < std::min<std::size_t>(n, tasks); ++t) helpers.emplace_back(work);
      work();
    }
    if (failure) std::rethrow_exception(failure);
  });
}

}  // namespace steelyard::inline v1
