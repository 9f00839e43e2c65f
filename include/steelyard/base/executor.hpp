// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <memory>
#include <mutex>
#include <utility>
#include <vector>

#include <steelyard/base/functional.hpp>

namespace steelyard::inline v1 {

/// How tasks are spread: called as `execute(n, f)`, it calls f(0) to f(n - 1),
/// in any order and on any threads, and returns after all of them. An empty one
/// calls them in turn. Answers do not depend on it.
class executor {
 public:
  using task = std::function<void(std::size_t)>;

  executor() = default;
  template <class Execute>
    requires(!std::is_same_v<std::remove_cvref_t<Execute>, executor> &&
             std::is_invocable_v<Execute const&, std::size_t, task const&>)
  executor(Execute execute) : execute_(std::move(execute)) {}  // NOLINT: implicit on purpose

  void operator()(std::size_t n, task const& f) const {
    if (execute_ && n > 1)
      execute_(n, f);
    else
      for (std::size_t i = 0; i < n; ++i) f(i);
  }
  [[nodiscard]] explicit operator bool() const noexcept { return static_cast<bool>(execute_); }

 private:
  std::function<void(std::size_t, task const&)> execute_;
};

namespace detail {

/// Things that one worker at a time uses: made on demand, handed on when done.
template <class T>
class worker_pool {
 public:
  explicit worker_pool(std::function<std::unique_ptr<T>()> make) : make_(std::move(make)) {}

  class lease {
   public:
    lease(worker_pool& pool, std::unique_ptr<T> held) : pool_(&pool), held_(std::move(held)) {}
    lease(lease const&) = delete;
    lease& operator=(lease const&) = delete;
    ~lease() {
      std::lock_guard const lock(pool_->mutex_);
      pool_->idle_.push_back(std::move(held_));
    }
    T& operator*() const noexcept { return *held_; }
    T* operator->() const noexcept { return held_.get(); }

   private:
    worker_pool* pool_;
    std::unique_ptr<T> held_;
  };

  [[nodiscard]] lease take() {
    {
      std::lock_guard const lock(mutex_);
      if (!idle_.empty()) {
        std::unique_ptr<T> last = std::move(idle_.back());
        idle_.pop_back();
        return lease(*this, std::move(last));
      }
      idle_.reserve(++made_);
    }
    return lease(*this, make_());
  }

 private:
  std::function<std::unique_ptr<T>()> make_;
  std::mutex mutex_;
  std::vector<std::unique_ptr<T>> idle_;
  std::size_t made_ = 0;
};

}  // namespace detail

}  // namespace steelyard::inline v1
