// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <cstddef>
#include <cstdint>
#include <memory>
#include <new>
#include <span>
#include <type_traits>
#include <utility>
#include <vector>

#include <steelyard/base/error.hpp>
#include <steelyard/base/functional.hpp>

namespace steelyard::inline v1::detail {

/// Contiguous states that are only ever moved in: no default construction, no
/// copy, and a plain array of them whatever the type (bool too).
template <class X>
class state_array {
 public:
  state_array() = default;
  state_array(state_array&& other) noexcept { swap(other); }
  state_array& operator=(state_array&& other) noexcept {
    swap(other);
    return *this;
  }
  ~state_array() {
    clear();
    std::allocator<X>().deallocate(data_, capacity_);
  }

  [[nodiscard]] std::size_t size() const noexcept { return size_; }
  [[nodiscard]] X* data() noexcept { return data_; }
  [[nodiscard]] X const* data() const noexcept { return data_; }
  [[nodiscard]] X& operator[](std::size_t i) noexcept { return data_[i]; }

  void reserve(std::size_t n) {
    if (n <= capacity_) return;
    X* const larger = std::allocator<X>().allocate(n);
    std::size_t moved = 0;
    try {
      for (; moved < size_; ++moved) ::new (static_cast<void*>(larger + moved)) X(std::move_if_noexcept(data_[moved]));
    } catch (...) {
      for (std::size_t i = 0; i < moved; ++i) larger[i].~X();
      std::allocator<X>().deallocate(larger, n);
      throw;
    }
    std::size_t const kept = size_;
    clear();
    if (data_ != nullptr) std::allocator<X>().deallocate(data_, capacity_);
    data_ = larger;
    size_ = kept;
    capacity_ = n;
  }
  template <class... Args>
    requires std::is_constructible_v<X, Args...>
  void emplace_back(Args&&... args) {
    if (size_ == capacity_) reserve(capacity_ == 0 ? 16 : 2 * capacity_);
    ::new (static_cast<void*>(data_ + size_)) X(std::forward<Args>(args)...);
    ++size_;
  }
  /// Moves all of another array's states to the end of this one.
  void append(state_array&& other) {
    if (size_ + other.size_ > capacity_) {
      std::size_t const doubled = 2 * capacity_;
      reserve(size_ + other.size_ > doubled ? size_ + other.size_ : doubled);
    }
    for (std::size_t i = 0; i < other.size_; ++i) emplace_back(std::move(other.data_[i]));
    other.clear();
  }
  void clear() noexcept {
    for (std::size_t i = size_; i-- > 0;) data_[i].~X();
    size_ = 0;
  }

 private:
  void swap(state_array& other) noexcept {
    std::swap(data_, other.data_);
    std::swap(size_, other.size_);
    std::swap(capacity_, other.capacity_);
  }

  X* data_ = nullptr;
  std::size_t size_ = 0;
  std::size_t capacity_ = 0;
};

/// Where the states of a weighted sample are: in memory, or made again from
/// their streams whenever they are looked at.
template <class X>
class state_store {
 public:
  using look = std::function<void(std::size_t, X const&)>;

  state_store() = default;
  state_store(state_store const&) = delete;
  state_store& operator=(state_store const&) = delete;
  virtual ~state_store() = default;

  /// The states in order, or null where they are not kept.
  [[nodiscard]] virtual X const* data() const noexcept = 0;
  /// Calls act(position, state) for these positions, in order.
  virtual void visit(std::span<std::size_t const> positions, look const& act) const = 0;
  /// Hands over fresh states of these positions, in order. @pre states are not kept
  virtual void remake(std::span<std::size_t const> positions, std::function<void(X&&)> const& take) const = 0;
  /// Calls of the sampler that looking at states has cost so far.
  [[nodiscard]] virtual std::uint64_t replays() const noexcept { return 0; }
};

/// States in memory: `Holder` owns them (an array, the user's vector) or borrows them (a span).
template <class X, class Holder>
class kept_states final : public state_store<X> {
 public:
  explicit kept_states(Holder holder) : holder_(std::move(holder)) {}

  [[nodiscard]] X const* data() const noexcept override { return holder_.data(); }
  void visit(std::span<std::size_t const> positions, typename state_store<X>::look const& act) const override {
    for (std::size_t const i : positions) act(i, holder_.data()[i]);
  }
  void remake(std::span<std::size_t const> positions, std::function<void(X&&)> const& take) const override {
    if constexpr (std::is_copy_constructible_v<X>)
      for (std::size_t const i : positions) take(X(holder_.data()[i]));
    else
      throw not_kept("remake: states in memory that cannot be copied are not made again");
  }
  /// For the one owner that may still add states.
  [[nodiscard]] Holder& holder() noexcept { return holder_; }

 private:
  Holder holder_;
};

}  // namespace steelyard::inline v1::detail
