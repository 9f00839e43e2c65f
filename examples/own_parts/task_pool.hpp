// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <condition_variable>
#include <cstddef>
#include <functional>
#include <mutex>
#include <thread>
#include <vector>

/// A pool of threads that live as long as it does and share out numbered
/// tasks: what a simulation code often has already.
class task_pool {
 public:
  explicit task_pool(unsigned n) {
    for (unsigned t = 0; t < n; ++t) threads_.emplace_back([this] { work(); });
  }
  task_pool(task_pool const&) = delete;
  task_pool& operator=(task_pool const&) = delete;
  ~task_pool() {
    {
      std::lock_guard const lock(mutex_);
      over_ = true;
    }
    ready_.notify_all();
    for (std::thread& each : threads_) each.join();
  }

  /// Calls f(0) to f(n - 1) on the pool's threads; returns after all of them.
  void run(std::size_t n, std::function<void(std::size_t)> const& f) {
    std::unique_lock lock(mutex_);
    task_ = &f;
    next_ = 0;
    size_ = n;
    left_ = n;
    ready_.notify_all();
    done_.wait(lock, [this] { return left_ == 0; });
    task_ = nullptr;
    size_ = 0;
  }

 private:
  void work() {
    std::unique_lock lock(mutex_);
    while (true) {
      ready_.wait(lock, [this] { return over_ || next_ < size_; });
      if (over_) return;
      std::size_t const i = next_++;
      std::function<void(std::size_t)> const& f = *task_;
      lock.unlock();
      f(i);
      lock.lock();
      if (--left_ == 0) done_.notify_one();
    }
  }

  std::mutex mutex_;
  std::condition_variable ready_, done_;
  std::function<void(std::size_t)> const* task_ = nullptr;
  std::size_t next_ = 0, size_ = 0, left_ = 0;
  bool over_ = false;
  std::vector<std::thread> threads_;
};
