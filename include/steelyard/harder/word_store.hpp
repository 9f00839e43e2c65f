// SPDX-License-Identifier: BSL-1.0
#pragma once

#include <atomic>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <memory>
#include <span>
#include <utility>
#include <vector>

#include <steelyard/base/executor.hpp>
#include <steelyard/draw/draws.hpp>
#include <steelyard/estimate/user_code.hpp>
#include <steelyard/sample/state_store.hpp>
#include <steelyard/weigh/concepts.hpp>

namespace steelyard::inline v1::detail {

/// States made again from the words they used, whenever they are looked at.
/// Memory: 8 bytes a word.
template <class Sampler>
class word_store final : public state_store<state_of_t<Sampler>> {
 public:
  using state = state_of_t<Sampler>;

  /// @param ends  where the words of each state end among all words
  word_store(Sampler sampler, std::vector<std::uint64_t> words, std::vector<std::size_t> ends)
      : sampler_(std::move(sampler)), words_(std::move(words)), ends_(std::move(ends)), pool_([this] {
          return std::make_unique<player>(sampler_);
        }) {}

  [[nodiscard]] state const* data() const noexcept override { return nullptr; }
  void visit(std::span<std::size_t const> positions, typename state_store<state>::look const& act) const override {
    auto const own = pool_.take();
    for (std::size_t const i : positions) play(*own, i, [&](auto&& x) { act(i, x); });
  }
  void remake(std::span<std::size_t const> positions, std::function<void(state&&)> const& take) const override {
    auto const own = pool_.take();
    for (std::size_t const i : positions) play(*own, i, [&](auto&& x) { take(state(std::forward<decltype(x)>(x))); });
  }
  [[nodiscard]] std::uint64_t replays() const noexcept override { return replays_.load(); }

 private:
  struct player {
    explicit player(Sampler const& sampler) : call(instance_of<Sampler>::make(sampler)), source(0) {}
    instance_t<Sampler> call;
    draws source;
    std::vector<std::uint64_t> words;
  };

  template <class Act>
  void play(player& own, std::size_t i, Act act) const {
    ++replays_;
    auto const from = static_cast<std::ptrdiff_t>(i > 0 ? ends_[i - 1] : 0);
    own.words.assign(words_.begin() + from, words_.begin() + static_cast<std::ptrdiff_t>(ends_[i]));
    draws_access::record(own.source, own.words, 0, i, purpose::move);
    auto&& drawn = call_user("the sampler", i, [&]() -> decltype(auto) { return std::invoke(own.call, own.source); });
    if constexpr (unwrap_optional<result_t<Sampler, draws&>>::may_be_empty)
      act(*std::forward<decltype(drawn)>(drawn));
    else
      act(std::forward<decltype(drawn)>(drawn));
  }

  Sampler sampler_;
  std::vector<std::uint64_t> words_;
  std::vector<std::size_t> ends_;
  mutable worker_pool<player> pool_;
  mutable std::atomic<std::uint64_t> replays_{0};
};

}  // namespace steelyard::inline v1::detail
